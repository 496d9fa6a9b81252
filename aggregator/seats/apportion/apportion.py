"""Votes into seats by a list method, for many rows (draws, districts) at once.

Floating point decides where it can prove its result. Any row within rounding of a tie is counted again in
rational arithmetic: a float is an exact fraction, so nothing is lost. A real tie is broken by the stated
rule and marked, as many electoral laws ask (common practice).
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from aggregator.seats.apportion.averages import BAD_VOTES, DOUBTFUL, TOO_MANY_HELD, fill_by_averages
from aggregator.seats.apportion.exact import apportion_exactly, in_order_of_claim
from aggregator.seats.apportion.list_method import MOST_SEATS, HighestAverages, ListMethod
from aggregator.seats.apportion.remainders import fill_by_remainders

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]
SeatArray = npt.NDArray[np.int16]
BoolArray = npt.NDArray[np.bool_]

TIE_RULES = ("lot", "most_votes")


@dataclass(frozen=True)
class Apportioned:
    """Seats shared out.

    Attributes
    ----------
    seats
        dims (row, party).
    tied
        dims (row,): a tie was broken by the stated rule.
    """

    seats: SeatArray
    tied: BoolArray


def apportion(
    votes: FloatArray,
    *,
    seats: IntArray | int,
    method: ListMethod,
    lot: npt.NDArray[np.floating],
    ties: str = "lot",
) -> Apportioned:
    """Share out the seats of every row among its parties.

    Parameters
    ----------
    votes
        dims (row, party), zero or more, any unit; zero for who gets no seat (absent, below a threshold).
    seats
        dims (row,), or one number for all: seats to share out.
    method
        From :func:`highest_averages` or :func:`largest_remainder`.
    lot
        dims (row, party), uniform on 0–1: each party's ticket. Read only where there is a tie, so a
        broadcast view will do. Tickets must differ; if not, the first in the file wins.
    ties
        ``lot``: the highest ticket wins. ``most_votes``: the most votes, then the highest ticket.

    Returns
    -------
    Apportioned
        Every row sums to its seats; a party without votes has none.

    Raises
    ------
    ValueError
        If votes are negative or not finite, a row with seats has no votes, seats are negative or more than
        32767, or shapes disagree.

    References
    ----------
    Gallagher, M. (1991). Proportionality, disproportionality and electoral systems. Electoral Studies 10,
    33–51. doi:10.1016/0261-3794(91)90004-C
    Pukelsheim, F. (2017). Proportional Representation, 2nd ed. Springer. doi:10.1007/978-3-319-64707-4
    """
    votes, seats = _checked(votes, seats, lot, ties)
    if isinstance(method, HighestAverages):
        start = np.zeros(votes.shape, dtype=np.int16)
        return continue_averages(votes, start=start, seats=seats, method=method, lot=lot, ties=ties)
    filled = np.empty(votes.shape, dtype=np.int16)
    state = fill_by_remainders(votes, seats, method.quota_seats, filled)
    _raise_for_bad_rows(state)
    tied = np.zeros(len(votes), dtype=np.bool_)
    for row in np.flatnonzero(state == DOUBTFUL):
        _count_again(row, votes, seats, method, None, lot, ties, filled, tied)
    return Apportioned(seats=filled, tied=tied)


def continue_averages(
    votes: FloatArray,
    *,
    start: npt.NDArray[np.integer],
    seats: IntArray | int,
    method: HighestAverages,
    lot: npt.NDArray[np.floating],
    ties: str = "lot",
) -> Apportioned:
    """Share out further seats by highest averages, going on from seats that parties hold already.

    Parameters
    ----------
    votes, method, lot, ties
        As for :func:`apportion`.
    start
        dims (row, party): seats held already. Whoever holds more than the votes are worth keeps them.
    seats
        dims (row,), or one number for all: seats in all, those held already among them.

    Returns
    -------
    Apportioned
        Every row sums to its seats; nobody has fewer than at the start.

    Raises
    ------
    ValueError
        As for :func:`apportion`, and if more seats are held than there are.
    """
    votes, seats = _checked(votes, seats, lot, ties)
    if start.shape != votes.shape or (start.size and start.min() < 0):
        raise ValueError("start: expected a number of seats, zero or more, for every row and party")
    filled = np.array(start, dtype=np.int16, order="C")
    state = fill_by_averages(votes, seats, float(method.first_divisor), method.step, filled)
    _raise_for_bad_rows(state)
    tied = np.zeros(len(votes), dtype=np.bool_)
    for row in np.flatnonzero(state == DOUBTFUL):
        # Of a party's averages two at most are within rounding of each other: those of its first two seats.
        sure = np.maximum(filled[row] - 2, start[row])
        _count_again(row, votes, seats, method, sure, lot, ties, filled, tied)
    return Apportioned(seats=filled, tied=tied)


def _count_again(
    row: np.intp,
    votes: FloatArray,
    seats: IntArray,
    method: ListMethod,
    start: npt.NDArray[np.integer] | None,
    lot: npt.NDArray[np.floating],
    ties: str,
    filled: SeatArray,
    tied: BoolArray,
) -> None:
    """Count one row in rational arithmetic, break its tie, and write both into ``filled`` and ``tied``."""
    exact = apportion_exactly(
        [Fraction(of_party) for of_party in votes[row].tolist()],
        seats=int(seats[row]),
        method=method,
        start=None if start is None else start.tolist(),
    )
    filled[row] = exact.seats
    claims = in_order_of_claim(exact.tied, votes=votes[row], lot=lot[row], ties=ties)
    filled[row, claims[: exact.contested]] += 1
    tied[row] = exact.contested > 0


def _checked(
    votes: FloatArray, seats: IntArray | int, lot: npt.NDArray[np.floating], ties: str
) -> tuple[FloatArray, IntArray]:
    if ties not in TIE_RULES:
        raise ValueError(f"ties: got {ties!r}; expected one of {', '.join(TIE_RULES)}")
    if votes.ndim != 2:
        raise ValueError(f"votes: got {votes.ndim} dims; expected (row, party)")
    if lot.shape != votes.shape:
        raise ValueError(f"lot: got shape {lot.shape}; expected that of the votes, {votes.shape}")
    # A copy: the compiled count would be compiled again for arrays that may not be written to.
    seats = np.array(np.broadcast_to(np.asarray(seats, dtype=np.int64), len(votes)))
    if seats.size and not 0 <= seats.min() <= seats.max() <= MOST_SEATS:
        raise ValueError(f"seats: got {seats.min()} to {seats.max()}; expected 0 to {MOST_SEATS}")
    return np.ascontiguousarray(votes, dtype=np.float64), seats


def _raise_for_bad_rows(state: npt.NDArray[np.uint8]) -> None:
    bad = np.flatnonzero(state == BAD_VOTES)
    if bad.size:
        raise ValueError(
            f"votes: {bad.size} rows, the first at position {bad[0]}, have seats to fill but no votes, or "
            "votes below zero or not finite"
        )
    crowded = np.flatnonzero(state == TOO_MANY_HELD)
    if crowded.size:
        raise ValueError(
            f"start: {crowded.size} rows, the first at position {crowded[0]}, hold more seats than there are"
        )
