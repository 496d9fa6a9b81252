"""What every counting rule is given and what it gives back.

A rule is one file with one function: the votes of the regions that count by it and its terms in, seats out.
`aggregator.seats.counting` lists them; a new rule is one new file and one new line there.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from aggregator.inputs.contest import OTHERS
from aggregator.inputs.counting_terms import Across, CountingTerms

Float32Array = npt.NDArray[np.float32]
FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]
SeatArray = npt.NDArray[np.int16]


@dataclass(frozen=True)
class SeatVotes:
    """Votes in every seat, draw by draw and date by date, kept as two factors to save memory.

    The votes of a party in a seat are proportional to its ``strength`` there times the ``multiplier`` of
    the seat's region on the date. The last date is polling day.

    Attributes
    ----------
    strength
        dims (draw, party, seat); zero where the party does not stand.
    multiplier
        dims (draw, date, region, party).
    region_start
        First seat of each region, then the number of seats.
    lot
        dims (draw, seat), uniform on 0–1: decides a tie.
    """

    strength: Float32Array
    multiplier: Float32Array
    region_start: IntArray
    lot: Float32Array

    @property
    def region_of_seat(self) -> IntArray:
        """Position of each seat's region."""
        return np.repeat(np.arange(self.region_start.size - 1), np.diff(self.region_start))

    @property
    def polling_day_shares(self) -> Float32Array:
        """Share of the vote on the last date: dims (draw, party, seat)."""
        share = self.multiplier[:, -1, self.region_of_seat].transpose(0, 2, 1) * self.strength
        share /= share.sum(axis=1, keepdims=True)
        return share

    def of_regions(self, regions: IntArray) -> SeatVotes:
        """Keep the seats of some regions, in the order given; the same object where that is all of them."""
        if np.array_equal(regions, np.arange(self.region_start.size - 1)):
            return self
        size = np.diff(self.region_start)[regions]
        seats = np.concatenate([np.arange(self.region_start[r], self.region_start[r + 1]) for r in regions])
        return SeatVotes(
            strength=np.ascontiguousarray(self.strength[:, :, seats]),
            multiplier=np.ascontiguousarray(self.multiplier[:, :, regions]),
            region_start=np.append(0, np.cumsum(size)),
            lot=np.ascontiguousarray(self.lot[:, seats]),
        )


@dataclass(frozen=True)
class GroupVotes:
    """Votes of the regions that count by one rule.

    Attributes
    ----------
    rows
        Votes by seat or district; None where the rule needs none.
    region_votes
        Share of each region's vote, dims (draw, date, region, party).
    turnout
        Each region's part of the whole country's votes, dims (draw, region).
    list_lot
        dims (draw, party), uniform on 0–1: the order in which tied lists are served.
    """

    rows: SeatVotes | None
    region_votes: Float32Array
    turnout: FloatArray
    list_lot: FloatArray

    @property
    def in_rows(self) -> SeatVotes:
        """Votes by seat or district, of a rule that fills seats there."""
        if self.rows is None:
            raise ValueError("This rule counts seat by seat and was given no votes by seat.")
        return self.rows

    def on_dates(self, dates: npt.NDArray[np.int64]) -> GroupVotes:
        """Keep some dates, by position."""
        rows = None
        if self.rows is not None:
            rows = replace(self.rows, multiplier=np.ascontiguousarray(self.rows.multiplier[:, dates]))
        return replace(self, rows=rows, region_votes=self.region_votes[:, dates])

    def votes_together(self, date: int) -> FloatArray:
        """Votes of all regions of the group on one date, parts of the country's: dims (draw, party)."""
        return np.einsum("dr,drp->dp", self.turnout, self.region_votes[:, date].astype(np.float64))


@dataclass(frozen=True)
class GroupTerms:
    """The terms by which a group of regions counts, with codes and places as positions.

    Attributes
    ----------
    terms
        The desk's terms.
    parties
        Codes, in the order of the votes.
    magnitude
        Members that each seat or district elects; empty where nothing is counted by rows.
    list_seats
        Seats filled from lists: one number by region where votes are added up by region, else one in all.
    joint_lists
        Positions of parties that run as one list.
    transfers
        Part of the voters of one party that vote for another in a run-off, dims (draw, from, to).
    """

    terms: CountingTerms
    parties: tuple[str, ...]
    magnitude: IntArray
    list_seats: IntArray
    joint_lists: tuple[tuple[int, ...], ...] = ()
    transfers: Float32Array | None = None

    @property
    def across(self) -> Across:
        """Where the votes of lists are added up."""
        return self.terms.across or Across.DISTRICT

    @property
    def others(self) -> int | None:
        """Position of others, which are many small parties and no list; None without others."""
        return self.parties.index(OTHERS) if OTHERS in self.parties else None

    @property
    def exempt(self) -> npt.NDArray[np.bool_]:
        """Which parties no threshold holds."""
        return np.isin(self.parties, self.terms.exempt)

    @property
    def first_divisor(self) -> Fraction:
        """The first divisor, exactly as the desk wrote it."""
        return Fraction(self.terms.first_divisor)


@dataclass(frozen=True)
class SeatsCounted:
    """Seats by the rule of a group of regions.

    Attributes
    ----------
    seats
        dims (draw, date, party). Every draw and date sums to the group's seats, overhang aside.
    won
        Members that each seat or district elects on the last date, dims (draw, seat, party); None where
        no seats are filled there.
    from_lists
        Of the seats of the last date, those that come from lists beside seats won locally, dims (draw,
        party); None where the rule is not mixed.
    ties
        Counts decided by lot, or by the rule for ties, over all dates; dims (draw).
    """

    seats: SeatArray
    won: npt.NDArray[np.signedinteger] | None
    from_lists: SeatArray | None
    ties: IntArray


CountSeats = Callable[[GroupVotes, GroupTerms], SeatsCounted]
