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
# As for highest averages: rows that one thread does on one piece of scratch memory.
_BLOCK = 256


@njit(parallel=True, cache=True)
def fill_by_remainders(votes, seats, quota_seats, filled):  # type: ignore[no-untyped-def]
    """Fill ``filled`` (row, party) with ``seats`` (row); say how sure each row is."""
    state = np.empty(len(votes), dtype=np.uint8)
    if len(votes) <= _BLOCK:
        _fill_block(0, votes, seats, quota_seats, filled, state)
        return state
    for block in prange((len(votes) + _BLOCK - 1) // _BLOCK):
        _fill_block(block, votes, seats, quota_seats, filled, state)
    return state


@njit(cache=True)
def _fill_block(block, votes, seats, quota_seats, filled, state):  # type: ignore[no-untyped-def]
    remainder = np.empty(votes.shape[1], dtype=np.float64)
    for row in range(block * _BLOCK, min((block + 1) * _BLOCK, len(votes))):
        state[row] = _fill(votes[row], seats[row], quota_seats, filled[row], remainder)


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
