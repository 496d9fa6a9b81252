"""Votes of lists into seats: methods, ties, thresholds, joint lists, mixed chambers."""
