"""Rows in parts: the regions of a row that answer for the same days."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

import numpy as np

from aggregator.estimate.knots import knot_weights
from aggregator.estimate.published_rows import Row
from aggregator.inputs.contest import Contest
from models.arrays import Floats, Indices, KnotArrays


@dataclass(frozen=True)
class PartArrays:
    """The parts of all rows; the fields are those of ``models.arrays.RowArrays``."""

    row_of_part: Indices
    national_weight: Floats
    region_weight: Floats
    region_mix: Floats


def part_arrays(rows: Sequence[Row], *, contest: Contest, knots: KnotArrays, turnout: Floats) -> PartArrays:
    """Split rows whose fieldwork outlasts the polling day of a region they ask in.

    Such a region has voted: whoever is asked there afterwards tells how the region voted, so its part of the
    row answers for no day later than that.
    """
    position = {code: i for i, code in enumerate(contest.region_codes)}
    zero = contest.last_polling_day.toordinal() - knots.national_day[-1]
    row_of_part, first, last, until, mixes = [], [], [], [], []
    for i, row in enumerate(rows):
        whole = turnout[[position[r] for r in row.regions]].sum()
        for stop, regions in _by_stop(row, contest).items():
            mix = np.zeros(len(turnout))
            at = [position[r] for r in regions]
            mix[at] = turnout[at] / whole
            row_of_part.append(i)
            first.append(row.start.toordinal() - zero)
            last.append(row.end.toordinal() - zero)
            until.append(stop.toordinal() - zero)
            mixes.append(mix)
    days = {
        "first_day": np.array(first, dtype=float),
        "last_day": np.array(last, dtype=float),
        "until": np.array(until, dtype=float),
    }
    return PartArrays(
        row_of_part=np.array(row_of_part, dtype=np.int64),
        national_weight=knot_weights(knots.national_day, **days),
        region_weight=knot_weights(knots.region_day, **days),
        region_mix=np.array(mixes),
    )


def _by_stop(row: Row, contest: Contest) -> dict[date, list[str]]:
    """Regions of a row by the last day they answer for."""
    groups: dict[date, list[str]] = {}
    for region in row.regions:
        groups.setdefault(min(row.end, contest.polling_day_of(region)), []).append(region)
    return groups
