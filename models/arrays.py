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
    lean_size
        Size c of the error that all polls share, dims (party), log units × √p.
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
    lean_size: Floats
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
        Calendar time between neighbouring knots, weeks, dims (knot − 1).
    national_jolt, region_jolt
        Opinion time that jolts add between neighbouring knots, weeks, dims (knot − 1).
    national_ramp, region_ramp
        How far each step lies up the ramp towards polling day, 0–1, dims (knot − 1); all zero where
        opinion time runs evenly.
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
    national_jolt: Floats
    region_jolt: Floats
    national_ramp: Floats
    region_ramp: Floats
    lean_clock: Floats
    lean_reference: float

    @property
    def has_ramp(self) -> bool:
        """Whether opinion time may run faster or slower towards polling day."""
        return bool((self.national_ramp > 0).any())


@dataclass(frozen=True)
class RowArrays:
    """The published figures, one entry per row.

    A row has one *part*, or several where some of its regions voted before its fieldwork: those answer for
    their own polling day.

    Attributes
    ----------
    polls, houses
        Labels, lengths I and H.
    poll_of_row
        Position in ``polls``, dims (row).
    house_of_row
        Position in ``houses``, dims (row).
    row_of_part
        Position of each part's row, dims (part).
    national_weight, region_weight
        Weight of each knot, averaged over the days the part answers for, dims (part, knot); parts sum to one.
    region_mix
        Turnout weights of the regions asked, dims (part, region); the parts of a row sum to one together.
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
    row_of_part: Indices
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
class LeanArrays:
    """What beside its house can make a row's figures differ from the average house's.

    The house and each of these is a *term*. Terms are numbered houses first, then eras, modes,
    populations and formations; the number after the last stands for none.

    Attributes
    ----------
    era_house
        Position of each era's house, dims (era); only houses that changed their method have eras.
    mode_share
        Share of the houses that interview in each mode, dims (mode); sums to one. Empty where the register
        has one mode.
    populations
        Labels of the populations asked beside the target one.
    formations
        Alliances that some rows give as one figure from their start on, while others name the members.
    formation_members
        One for an alliance's members, dims (formation, party).
    eras, modes
        Labels.
    terms_of_row
        Number of each row's terms, dims (row, slot).
    """

    eras: tuple[str, ...]
    era_house: Indices
    modes: tuple[str, ...]
    mode_share: Floats
    populations: tuple[str, ...]
    formations: tuple[str, ...]
    formation_members: Floats
    terms_of_row: Indices


@dataclass(frozen=True)
class CountedArrays:
    """Regions that have voted and been counted.

    Attributes
    ----------
    region
        Position of each region, dims (counted).
    share
        Its result, dims (counted, party), rows sum to one.
    national_weight, region_weight
        Weight of each knot on the region's polling day, dims (counted, knot).
    people
        How many randomly drawn people a count is worth to the model; see :mod:`models.counted_regions`.
    """

    region: Indices
    share: Floats
    national_weight: Floats
    region_weight: Floats
    people: float


@dataclass(frozen=True)
class ElectionArrays:
    """Everything the model is built from; ``counted`` is None while no region has been counted."""

    country: CountryArrays
    knots: KnotArrays
    rows: RowArrays
    leans: LeanArrays
    counted: CountedArrays | None = None

    def check(self) -> None:
        """Refuse arrays that contradict each other.

        Raises
        ------
        ModelInputError
            Naming the array and what is wrong with it.
        """
        country, rows = self.country, self.rows
        for part in (country, self.knots, rows, self.leans, self.counted):
            for field in fields(part) if part is not None else ():
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
        for name in ("national_weight", "region_weight"):
            _require(np.allclose(getattr(rows, name).sum(axis=1), 1), f"{name} must sum to one in every part")
        mix = np.bincount(rows.row_of_part, weights=rows.region_mix.sum(axis=1))
        _require(
            len(mix) == len(rows.respondents) and np.allclose(mix, 1),
            "region_mix must sum to one in every row",
        )
        _require(
            bool((rows.partition.sum(axis=1) <= 1).all()), "a party may be in one cell of a row at the most"
        )


def _require(holds: bool | np.bool_, message: str) -> None:
    if not holds:
        raise ModelInputError(message)
