"""Invented elections: the scripts that make them, one folder for each, and the truth behind it."""
