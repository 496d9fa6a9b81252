"""Highest averages for many rows of votes at once, in floating point, with a proof of each result.

A row starts where the votes alone put it and is mended seat by seat (the jump-and-step algorithm,
Pukelsheim 2017, section 4.6), so that the work grows with parties, not with seats. The result is right if
the lowest average that won a seat is above the highest one that did not (the max-min inequality, Pukelsheim
2017, section 4.5). Where the two are within rounding of each other the row is marked as doubtful.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

SURE, DOUBTFUL, BAD_VOTES, TOO_MANY_HELD = 0, 1, 2, 3
"""What became of a row."""

# A quotient carries the rounding of a sum over parties, a share and a division: some 1e-14 at worst.
_ROUNDING = 1e-12
# Rows that one thread does on one piece of scratch memory. A single block is not worth waking other threads.
_BLOCK = 256


# A row is one thread's work from start to end: the number of threads changes nothing.
@njit(parallel=True, cache=True)
def fill_by_averages(votes, seats, first_divisor, step, filled):  # type: ignore[no-untyped-def]
    """Fill ``filled`` (row, party), which holds the seats held at the start, up to ``seats`` (row)."""
    state = np.empty(len(votes), dtype=np.uint8)
    if len(votes) <= _BLOCK:
        _fill_block(0, votes, seats, first_divisor, step, filled, state)
        return state
    for block in prange((len(votes) + _BLOCK - 1) // _BLOCK):
        _fill_block(block, votes, seats, first_divisor, step, filled, state)
    return state


@njit(cache=True)
def _fill_block(block, votes, seats, first_divisor, step, filled, state):  # type: ignore[no-untyped-def]
    scratch = np.empty((3, votes.shape[1]), dtype=np.float64)
    held = np.empty(votes.shape[1], dtype=np.int64)
    for row in range(block * _BLOCK, min((block + 1) * _BLOCK, len(votes))):
        state[row] = _fill(votes[row], seats[row], first_divisor, step, filled[row], held, scratch)


@njit(cache=True)
def _divisor(seat, first_divisor, step):  # type: ignore[no-untyped-def]
    return first_divisor if seat == 1 else 1.0 + step * (seat - 1)


@njit(cache=True)
def _fill(votes, seats, first_divisor, step, filled, held, scratch):  # type: ignore[no-untyped-def]
    """Jump to where the votes alone put the parties, step to the number of seats, and prove the result."""
    share, won, coming = scratch[0], scratch[1], scratch[2]
    n_parties = votes.size
    n_held = 0
    for party in range(n_parties):
        held[party] = filled[party]
        n_held += held[party]
    if n_held > seats:
        return TOO_MANY_HELD
    total, standing = 0.0, 0
    for party in range(n_parties):
        if not votes[party] >= 0:
            return BAD_VOTES
        total += votes[party]
        standing += votes[party] > 0
    if not total < np.inf:
        return BAD_VOTES
    if n_held == seats:
        return SURE
    if total == 0:
        return BAD_VOTES

    reach = seats + standing * (1.0 / step - 0.5)
    n_filled = 0
    for party in range(n_parties):
        share[party] = votes[party] / total
        number = int(share[party] * reach + 1.0 - 1.0 / step)
        if number <= 1:
            number = int(share[party] * reach * step >= first_divisor)
        number = max(min(number, seats), held[party])
        filled[party] = number
        n_filled += number
        won[party] = np.inf
        if number > held[party]:
            won[party] = share[party] / _divisor(number, first_divisor, step)
        coming[party] = share[party] / _divisor(number + 1, first_divisor, step)
    while n_filled < seats:
        party = int(np.argmax(coming))
        filled[party] += 1
        n_filled += 1
        won[party] = coming[party]
        coming[party] = share[party] / _divisor(filled[party] + 1, first_divisor, step)
    while n_filled > seats:
        party = int(np.argmin(won))
        filled[party] -= 1
        n_filled -= 1
        coming[party] = won[party]
        won[party] = np.inf
        if filled[party] > held[party]:
            won[party] = share[party] / _divisor(filled[party], first_divisor, step)
    return SURE if won.min() > coming.max() * (1 + _ROUNDING) else DOUBTFUL
