"""What the model is given: labelled numbers only, no files and no tables.

A *row* is one published set of figures: a whole poll, or one region of a poll that reports a
breakdown. A *cell* is one figure of a row: a party, an alliance, or all the rest together.
"""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Indices = NDArray[np.int64]


class ModelInputError(ValueError):
    """The arrays handed to the model contradict each other."""


@dataclass(frozen=True)
class CountryArrays:
    """Parties and regions, and where they stood at the last election.

    Attributes
    ----------
    parties, regions
        Labels, lengths P and R.
    turnout
        Each region's share of the country's votes, dims (region), sums to one.
    standing
        Whether a party stands in a region, dims (region, party).
    start_log_share
        Log of the last result's share, or of the prior median for a party without a record, dims (region,
        party); of no meaning where the party does not stand.
    reference_share
        The party's typical national share, dims (party), share 0–1: sets the size of its scales.
    pilot_share
        Rough national support over the register, dims (party), sums to one: sets the sampling
        coordinates only, never the model.
    free_party
        Positions of the parties without a last result, dims (free party).
    """

    parties: tuple[str, ...]
    regions: tuple[str, ...]
    turnout: Floats
    standing: NDArray[np.bool_]
    start_log_share: Floats
    reference_share: Floats
    pilot_share: Floats
    free_party: Indices


@dataclass(frozen=True)
class KnotArrays:
    """The days between which opinion moves in straight lines; knot 0 is the start of the walk.

    Attributes
    ----------
    national_day, region_day
        Days since the first national knot, ascending, dims (knot); the last is polling day.
    national_step, region_step
        Opinion time between neighbouring knots, weeks, dims (knot − 1).
    lean_clock
        Position of each national knot between last result (0) and polling day (1), dims (knot).
    lean_reference
        The clock's position at the middle of the register: where a party without a record is
        pinned to what polls say of it.
    """

    national_day: Floats
    region_day: Floats
    national_step: Floats
    region_step: Floats
    lean_clock: Floats
    lean_reference: float


@dataclass(frozen=True)
class RowArrays:
    """The published figures, one entry per row.

    Attributes
    ----------
    polls, houses
        Labels, lengths I and H.
    poll_of_row
        Position in ``polls``, dims (row).
    house_of_row
        Position in ``houses``, dims (row).
    national_weight, region_weight
        Weight of each knot, averaged over the days of fieldwork, dims (row, knot); rows sum to one.
    region_mix
        Turnout weights of the regions asked, dims (row, region); rows sum to one.
    respondents
        Respondents behind the row's figures, dims (row).
    poll_respondents
        Respondents of the whole poll the row belongs to, dims (row).
    weighting_known
        One where the desk gave an effective sample, so that no weighting loss is left to learn; else
        zero, dims (row).
    partition
        One where a cell contains a party, dims (row, cell, party).
    answers
        Share × respondents of each cell, dims (row, cell); zero in unused cells.
    used
        One where the row has the cell, dims (row, cell).
    small_row, small_cell
        Which cells are only known to lie between two counts, dims (small).
    small_low, small_high
        Those counts, dims (small), unit: respondents.
    """

    polls: tuple[str, ...]
    houses: tuple[str, ...]
    poll_of_row: Indices
    house_of_row: Indices
    national_weight: Floats
    region_weight: Floats
    region_mix: Floats
    respondents: Floats
    poll_respondents: Floats
    weighting_known: Floats
    partition: Floats
    answers: Floats
    used: Floats
    small_row: Indices
    small_cell: Indices
    small_low: Floats
    small_high: Floats


@dataclass(frozen=True)
class ElectionArrays:
    """Everything the model is built from."""

    country: CountryArrays
    knots: KnotArrays
    rows: RowArrays

    def check(self) -> None:
        """Refuse arrays that contradict each other.

        Raises
        ------
        ModelInputError
            Naming the array and what is wrong with it.
        """
        country, rows = self.country, self.rows
        for part in (country, self.knots, rows):
            for field in fields(part):
                value = getattr(part, field.name)
                if isinstance(value, np.ndarray) and value.dtype.kind == "f" and not np.isfinite(value).all():
                    raise ModelInputError(f"{field.name} holds a value that is not a finite number")
        _require(np.isclose(country.turnout.sum(), 1), "turnout must sum to one")
        _require(np.isclose(country.pilot_share.sum(), 1), "pilot_share must sum to one")
        _require(bool((country.pilot_share > 0).all()), "pilot_share must be positive")
        _require(bool(country.standing.any(axis=1).all()), "every region needs a party that stands there")
        _require(len(rows.respondents) > 0, "there must be at least one row")
        _require(bool((rows.respondents > 1).all()), "every row needs more than one respondent")
        _require(
            bool((rows.poll_respondents >= rows.respondents - 1e-6).all()),
            "a row cannot hold more respondents than its poll",
        )
        for name in ("national_weight", "region_weight", "region_mix"):
            _require(np.allclose(getattr(rows, name).sum(axis=1), 1), f"{name} must sum to one in every row")
        _require(
            bool((rows.partition.sum(axis=1) <= 1).all()), "a party may be in one cell of a row at the most"
        )


def _require(holds: bool | np.bool_, message: str) -> None:
    if not holds:
        raise ModelInputError(message)
