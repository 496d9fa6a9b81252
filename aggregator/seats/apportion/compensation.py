"""Mixed chambers: list seats that make up for what local seats leave out of proportion.

All seats, local and list, are shared out by the list votes; a party's local seats count towards its part.
Where a party has more local seats than its part (overhang), three rules are in use:

* ``kept``: it keeps them, nobody else gives way, the chamber grows by them.
* ``levelled``: the chamber grows until every party's part covers its local seats, by the fewest seats.
* ``within``: the chamber keeps its size; what is left is shared out among the others, and so on until no
  party has more local seats than its part.

Who has local seats but no list votes that count (independents, parties below the threshold) keeps them
outside the proportion: they come off the seats that are shared out.

References
----------
Pukelsheim, F. (2017). Proportional Representation, 2nd ed., chapters 12 and 13. Springer.
doi:10.1007/978-3-319-64707-4
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from aggregator.seats.apportion.apportion import Apportioned, BoolArray, apportion, continue_averages
from aggregator.seats.apportion.list_method import MOST_SEATS, HighestAverages, ListMethod

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

OVERHANG_RULES = ("kept", "levelled", "within")

GROWTH_LIMIT = 4
"""A levelled chamber grows to this many times its regular size at most.

A party with local seats and hardly any list votes would make it grow without end. No parliament has come
near to doubling by levelling; a draw beyond four times says that the votes of the two ballots do not go
together.
"""


@dataclass(frozen=True)
class Compensated(Apportioned):
    """Seats of a mixed chamber, local and list together.

    Attributes
    ----------
    seats, tied
        As of :class:`Apportioned`; rows may sum to more than the regular chamber.
    stopped
        dims (row,): a levelled chamber reached its limit before all was in proportion; parties with more
        local seats than their part then keep them.
    """

    stopped: BoolArray


def compensate(
    votes: FloatArray,
    *,
    local: npt.NDArray[np.integer],
    seats: IntArray | int,
    method: ListMethod,
    overhang: str = "kept",
    lot: npt.NDArray[np.floating],
    ties: str = "lot",
) -> Compensated:
    """Share out a mixed chamber so that list seats make up for the local ones.

    Parameters
    ----------
    votes
        dims (row, party): list votes, zero for who gets no list seats.
    local
        dims (row, party): local seats won.
    seats
        dims (row,), or one number for all: regular size of the chamber, local and list seats.
    method, lot, ties
        As for :func:`apportion`.
    overhang
        ``kept``, ``levelled`` or ``within``, as above.

    Returns
    -------
    Compensated
        Seats in all, never below the local ones. ``tied`` where lot or rule decided a part.

    Raises
    ------
    ValueError
        As for :func:`apportion`, and if more local seats are won than there are seats.
    """
    if overhang not in OVERHANG_RULES:
        raise ValueError(f"overhang: got {overhang!r}; expected one of {', '.join(OVERHANG_RULES)}")
    local_seats = np.asarray(local, dtype=np.int64)
    if local_seats.shape != votes.shape or (local_seats.size and local_seats.min() < 0):
        raise ValueError("local: expected a number of seats, zero or more, for every row and party")
    seats = np.broadcast_to(np.asarray(seats, dtype=np.int64), len(votes))
    crowded = np.flatnonzero(local_seats.sum(axis=1) > seats)
    if crowded.size:
        raise ValueError(
            f"local: {crowded.size} rows, the first at position {crowded[0]}, have more local seats than "
            "the chamber has seats"
        )
    outside = np.where(votes > 0, 0, local_seats)
    inside = local_seats - outside
    to_share = seats - outside.sum(axis=1)
    stopped = np.zeros(len(votes), dtype=np.bool_)
    if overhang == "kept":
        part = apportion(votes, seats=to_share, method=method, lot=lot, ties=ties)
        part = Apportioned(seats=np.maximum(part.seats, inside).astype(np.int16), tied=part.tied)
    elif overhang == "within":
        part = _within(votes, inside, to_share, method, lot, ties)
    else:
        limit = np.minimum(GROWTH_LIMIT * seats, MOST_SEATS) - outside.sum(axis=1)
        part, stopped = _levelled(votes, inside, to_share, limit, method, lot, ties)
    return Compensated(seats=part.seats + outside.astype(np.int16), tied=part.tied, stopped=stopped)


def _within(
    votes: FloatArray,
    local: IntArray,
    seats: IntArray,
    method: ListMethod,
    lot: npt.NDArray[np.floating],
    ties: str,
) -> Apportioned:
    """Highest averages go on from the local seats, which comes to the same; remainders take rounds."""
    if isinstance(method, HighestAverages):
        return continue_averages(votes, start=local, seats=seats, method=method, lot=lot, ties=ties)
    filled = np.zeros(votes.shape, dtype=np.int16)
    tied = np.zeros(len(votes), dtype=np.bool_)
    keeps = np.zeros(votes.shape, dtype=np.bool_)
    rows = np.arange(len(votes))
    while rows.size:
        kept = np.where(keeps[rows], local[rows], 0)
        part = apportion(
            np.where(keeps[rows], 0.0, votes[rows]),
            seats=seats[rows] - kept.sum(axis=1),
            method=method,
            lot=lot[rows],
            ties=ties,
        )
        filled[rows] = part.seats + kept
        tied[rows] = part.tied
        over = local[rows] > filled[rows]
        keeps[rows] |= over
        rows = rows[over.any(axis=1)]
    return Apportioned(seats=filled, tied=tied)


def _levelled(
    votes: FloatArray,
    local: IntArray,
    seats: IntArray,
    limit: IntArray,
    method: ListMethod,
    lot: npt.NDArray[np.floating],
    ties: str,
) -> tuple[Apportioned, BoolArray]:
    """The smallest chamber in which every part covers the local seats, tried one by one from a bound."""
    filled = np.zeros(votes.shape, dtype=np.int16)
    tied = np.zeros(len(votes), dtype=np.bool_)
    stopped = np.zeros(len(votes), dtype=np.bool_)
    size = np.minimum(np.maximum(seats, _least_chamber(votes, local, method)), limit)
    rows = np.arange(len(votes))
    while rows.size:
        part = apportion(votes[rows], seats=size[rows], method=method, lot=lot[rows], ties=ties)
        filled[rows] = np.maximum(part.seats, local[rows])
        tied[rows] = part.tied
        short = (part.seats < local[rows]).any(axis=1)
        stopped[rows] = short & (size[rows] >= limit[rows])
        rows = rows[short & (size[rows] < limit[rows])]
        size[rows] += 1
    return Apportioned(seats=filled, tied=tied), stopped


def _least_chamber(votes: FloatArray, local: IntArray, method: ListMethod) -> IntArray:
    """A number of seats that no chamber covering the local seats can be below: dims (row,).

    Highest averages: all averages above that of the local seat with the lowest have their seat before it.
    Largest remainder: a party gets at most one seat above its full quotas.
    """
    needed = local > 0
    share = votes / np.maximum(votes.sum(axis=1, keepdims=True), np.finfo(np.float64).tiny)
    # A little too few costs one more trial; too many could miss the smallest chamber.
    below = 1 - 1e-9
    if not isinstance(method, HighestAverages):
        wanted = np.divide(local - 1, share, out=np.zeros_like(share), where=needed) * below
        return np.clip(np.floor(wanted).max(axis=1) - method.quota_seats, 0, MOST_SEATS).astype(np.int64)
    divisor = np.where(local == 1, float(method.first_divisor), 1.0 + method.step * (local - 1))
    average = np.divide(share, divisor, out=np.full_like(share, np.inf), where=needed)
    lowest = average.min(axis=1, keepdims=True)
    reach = np.minimum(share / lowest, method.step * float(MOST_SEATS)) * below
    before = np.ceil((reach - 1) / method.step)
    before = np.where(before <= 1, reach > float(method.first_divisor), before)
    return np.minimum(before.sum(axis=1) + needed.any(axis=1), MOST_SEATS).astype(np.int64)
