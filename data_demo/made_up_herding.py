"""Houses that pull their figures towards what the others say."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date
from typing import ClassVar

import numpy as np
import pandas as pd

from data_demo.made_up_country import Country
from data_demo.made_up_field_mean import (
    FEWEST_POLLS,
    PollRow,
    field_mean,
    members_of,
    number_in,
    offered_shares,
    printed_figure,
    recent_polls,
)
from data_demo.made_up_polls import Register
from data_demo.made_up_scenery import OTHERS, Scenery
from data_demo.made_up_violation import Violation


@dataclass(frozen=True)
class Herding(Violation):
    """Every house moves its national figures part of the way to the recent mean of the others.

    The mean is that of national polls published in the three weeks before, herded ones among them; where
    there are fewer than three, a house prints what it found. Regional figures of the same poll move by the
    same factors; polls of one region stay as they were.

    Attributes
    ----------
    pull
        How far, from 0 (not at all) to 1 (it prints the mean).
    """

    pull: float = 0.5

    name: ClassVar[str] = "herding"
    what: ClassVar[str] = (
        "Every house pulls its figures halfway to the mean of the others' polls of the last three weeks."
    )

    def change_register(self, register: Register, *, country: Country, rng: np.random.Generator) -> Register:
        """Herd poll after poll, in order of publication."""
        scenery = country.scenery
        rows: list[dict[str, object]] = register.polls.to_dict("records")  # type: ignore[assignment]
        grids = {house.name: house.grid for house in scenery.houses}
        places = register.polls.groupby("poll", sort=False).indices.values()
        for poll in places:
            national = [k for k in poll if rows[k]["region"] == ""]
            if not national:
                continue
            first = rows[national[0]]
            day = date.fromisoformat(str(first["published"]))
            others = recent_polls(rows, day=day, house=str(first["house"]))
            if len(others) < FEWEST_POLLS:
                continue
            mean = field_mean(others, scenery=scenery, last_shares=country.last_shares)
            factors = self._factors(first, mean=mean, scenery=scenery)
            for k in poll:
                rows[k] |= _moved(rows[k], factors=factors, grid=grids[str(first["house"])], scenery=scenery)
        polls = pd.DataFrame(rows, columns=register.polls.columns)
        return replace(register, polls=polls)

    def _factors(self, row: PollRow, *, mean: np.ndarray, scenery: Scenery) -> dict[str, float]:
        """Herded share over the house's own, by code."""
        own = offered_shares(row, scenery=scenery)
        target = {c: 100 * mean[members_of(c, offered=own, scenery=scenery)].sum() for c in own}
        # What nobody chose stays at nothing: there is no interview to count it from.
        return {c: 1 + self.pull * (target[c] / own[c] - 1) if own[c] > 0 else 1.0 for c in own}


def _moved(row: PollRow, *, factors: dict[str, float], grid: float, scenery: Scenery) -> dict[str, object]:
    """Figures of one row after the pull, as printed: only those that the house prints."""
    own = offered_shares(row, scenery=scenery)
    moved = {code: share * factors.get(code, 1.0) for code, share in own.items()}
    decided = 100 - number_in(row["undecided"], blank=0.0)
    total = sum(moved.values())
    return {
        code: printed_figure(decided * share / total, grid=grid)
        for code, share in moved.items()
        if code != OTHERS or not np.isnan(number_in(row[OTHERS]))
    }
