"""From checked desk inputs to posterior draws: arrays, fit, checks."""
