"""Largest remainder for many rows of votes at once, in floating point, with every doubt marked.

A row is doubtful where a party's votes are within rounding of a whole number of quotas, or the last
remainder that wins a seat is within rounding of the first that does not.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from aggregator.seats.apportion.averages import BAD_VOTES, DOUBTFUL, SURE

# A number of quotas carries the rounding of a sum over parties, a share and a product, per seat.
_ROUNDING = 1e-12
_BLOCK = 128


@njit(parallel=True, cache=True)
def fill_by_remainders(votes, seats, quota_seats, filled):  # type: ignore[no-untyped-def]
    """Fill ``filled`` (row, party) with ``seats`` (row); say how sure each row is."""
    n_rows, n_parties = votes.shape
    state = np.empty(n_rows, dtype=np.uint8)
    n_blocks = (n_rows + _BLOCK - 1) // _BLOCK
    for block in prange(n_blocks):
        remainder = np.empty(n_parties, dtype=np.float64)
        for row in range(block * _BLOCK, min((block + 1) * _BLOCK, n_rows)):
            state[row] = _fill(votes[row], seats[row], quota_seats, filled[row], remainder)
    return state


@njit(cache=True)
def _fill(votes, seats, quota_seats, filled, remainder):  # type: ignore[no-untyped-def]
    filled[:] = 0
    total = 0.0
    for party in range(votes.size):
        if not votes[party] >= 0:
            return BAD_VOTES
        total += votes[party]
    if not total < np.inf:
        return BAD_VOTES
    if seats == 0:
        return SURE
    if total == 0:
        return BAD_VOTES

    rounding = _ROUNDING * (seats + quota_seats)
    still_open = seats
    for party in range(votes.size):
        quotas = votes[party] / total * (seats + quota_seats)
        nearest = np.rint(quotas)
        if nearest >= 1 and abs(quotas - nearest) <= rounding:
            return DOUBTFUL
        filled[party] = int(quotas)
        remainder[party] = quotas - filled[party]
        still_open -= filled[party]
    last = np.inf
    for _ in range(still_open):
        party = int(np.argmax(remainder))
        filled[party] += 1
        last = remainder[party]
        remainder[party] = -1.0
    return SURE if last > remainder.max() + rounding else DOUBTFUL
