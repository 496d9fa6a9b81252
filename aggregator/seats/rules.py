"""What every counting rule is given and what it gives back.

A rule is one file with one function, ``SeatVotes`` in, ``SeatsCounted`` out; `aggregator.seats.counting`
lists them.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Float32Array = npt.NDArray[np.float32]
IntArray = npt.NDArray[np.int64]


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
    def polling_day_shares(self) -> Float32Array:
        """Share of the vote on the last date: dims (draw, party, seat)."""
        region_of_seat = np.repeat(np.arange(self.region_start.size - 1), np.diff(self.region_start))
        share = self.multiplier[:, -1, region_of_seat].transpose(0, 2, 1) * self.strength
        share /= share.sum(axis=1, keepdims=True)
        return share


@dataclass(frozen=True)
class SeatsCounted:
    """Seats by the rule of the contest.

    Attributes
    ----------
    seats
        dims (draw, date, party); every draw and date sums to the chamber.
    chance
        dims (seat, party): how often each party wins each seat on the last date.
    """

    seats: npt.NDArray[np.int16]
    chance: npt.NDArray[np.float64]


CountSeats = Callable[[SeatVotes], SeatsCounted]
