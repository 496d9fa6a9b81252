"""Questions that a register raises: figures too alike or too neat, odd samples, odd dates."""
