"""Swing and count written a second time in plain numpy, for the compiled code to be tested against."""

from __future__ import annotations

from itertools import pairwise

import numpy as np


def reference_multipliers(
    strength: np.ndarray, support: np.ndarray, weight: np.ndarray, region_start: np.ndarray
) -> np.ndarray:
    """Factors (draw, date, region, party) by many cold-started steps in double precision."""
    strength = strength.astype(float)
    factor = np.ones(support.shape)
    for region, (first, last) in enumerate(pairwise(region_start)):
        here, part = strength[:, None, :, first:last], weight[first:last]
        wanted = support[:, :, region].astype(float)
        for _ in range(3000):
            votes = here * factor[:, :, region, :, None]
            mean = (part * votes / votes.sum(axis=2, keepdims=True)).sum(axis=-1)
            factor[:, :, region] *= np.divide(wanted, mean, out=np.zeros_like(mean), where=mean > 0)
    return factor


def reference_votes(strength: np.ndarray, multiplier: np.ndarray, region_start: np.ndarray) -> np.ndarray:
    """Share of each party in each seat: (draw, date, party, seat)."""
    of_seat = np.repeat(np.arange(region_start.size - 1), np.diff(region_start))
    votes = strength[:, None] * multiplier[:, :, of_seat].transpose(0, 1, 3, 2)
    return votes / votes.sum(axis=2, keepdims=True)


def reference_count(votes: np.ndarray) -> np.ndarray:
    """Seats of each party where no seat is tied: (draw, date, party)."""
    winner = votes.argmax(axis=2)
    return np.stack([(winner == party).sum(axis=-1) for party in range(votes.shape[2])], axis=-1)
