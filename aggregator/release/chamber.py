"""The size of the chamber and its majority line, in numbers and in words.

Where every draw has the same number of seats a majority is one number. Where overhang seats enlarge the
chamber the line moves with it, unless the contest states a number of its own.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.release.rounding import whole_text
from aggregator.seats.majorities import IntArray, majority_line
from models.dimensions import CHAIN, DRAW, PARTY


@dataclass(frozen=True)
class Chamber:
    """A chamber on polling day.

    Attributes
    ----------
    regular, majority
        Seats without overhang, and what is a majority of them.
    size, line
        90 % intervals of all seats and of the majority line.
    middle_line
        The median of the line.
    grows, line_moves
        Whether any draw has another number of seats, or another line.
    ties
        Counts in which two had the same claim to a seat, over all draws and dates.
    """

    regular: int
    majority: int
    size: tuple[int, int]
    line: tuple[int, int]
    middle_line: int
    grows: bool
    line_moves: bool
    ties: int = 0

    @property
    def line_text(self) -> str:
        """The line for the label of a chart: ``majority: 76 of 150``, ``majority: 78 to 81``."""
        if self.line_moves:
            return f"majority: {_range(self.line)}"
        return f"majority: {whole_text(self.majority)} of {whole_text(self.regular)}"

    @property
    def majority_text(self) -> str:
        """What a majority is, inside a sentence: ``76 of 150``."""
        if not self.line_moves:
            of = "the regular " if self.grows else ""
            return f"{whole_text(self.majority)} of {of}{whole_text(self.regular)}"
        regular = f"{whole_text(self.majority)} of the regular {whole_text(self.regular)}"
        return f"{regular}, and more with overhang seats"

    @property
    def sentence(self) -> str:
        """Size and line as a sentence."""
        if not self.grows:
            return f"A majority is {self.majority_text}."
        line = (
            f"a majority is {whole_text(self.majority)} of the regular seats, and {_range(self.line)} with "
            "overhang"
            if self.line_moves
            else f"a majority stays {whole_text(self.majority)}"
        )
        return (
            f"The chamber has {whole_text(self.regular)} regular seats; with overhang seats it has "
            f"{_range(self.size)} (90 % interval), and {line}."
        )


def _range(ends: tuple[int, int]) -> str:
    low, high = ends
    return whole_text(low) if low == high else f"{whole_text(low)} to {whole_text(high)}"


def describe_chamber(seats: xr.Dataset, *, contest: Contest) -> Chamber:
    """Measure the chamber of polling day.

    Parameters
    ----------
    seats
        Draws of seats: ``seats_polling_day`` (chain, draw, party), and the attribute ``chamber``, the regular
        number of seats; ``ties_broken`` (chain, draw) where ties were counted.
    contest
        May set a majority of its own.
    """
    regular = int(seats.attrs["chamber"])
    size = sizes_in_draws(seats["seats_polling_day"])
    line = majority_line(contest, chamber=size)
    return Chamber(
        regular=regular,
        majority=int(majority_line(contest, chamber=regular)),
        size=_interval(size),
        line=_interval(line),
        middle_line=int(np.quantile(line, 0.5, method="inverted_cdf")),
        grows=bool((size != regular).any()),
        line_moves=bool(np.ptp(line) > 0),
        ties=int(seats["ties_broken"].sum()) if "ties_broken" in seats else 0,
    )


def sizes_in_draws(seats: xr.DataArray) -> IntArray:
    """Seats of the whole chamber on one day: dims (chain, draw)."""
    size: IntArray = seats.sum(PARTY, dtype=np.int64).transpose(CHAIN, DRAW).to_numpy()
    return size


def _interval(values: IntArray) -> tuple[int, int]:
    low, high = np.quantile(values, [0.05, 0.95], method="inverted_cdf")
    return int(low), int(high)
