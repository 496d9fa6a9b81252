"""A house that interviews nobody."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date, timedelta
from typing import ClassVar

import numpy as np
import pandas as pd

from data_demo.made_up_country import Country
from data_demo.made_up_field_mean import FEWEST_POLLS, field_mean, printed_figure, recent_polls
from data_demo.made_up_polls import Register
from data_demo.made_up_violation import Violation

FIELDWORK_DAYS = 3
GRID = 0.1


@dataclass(frozen=True)
class FalseHouse(Violation):
    """A new house prints the mean of the others with a course of its own, and claims large samples.

    No truth is told of the house: its figures measure nothing.

    Attributes
    ----------
    house
        Its name.
    sample
        Interviews it claims, give or take a tenth.
    every_days
        How often it publishes.
    wander
        Sd of its distance from the field in log points for a party of 15 %, other parties by 1/√p: .08 is a
        point. With ten weeks to come back, it moves about as fast from week to week as opinion does.
    weeks
        Weeks after which a distance has shrunk to a third.
    """

    house: str = "House Zero"
    sample: int = 4000
    every_days: int = 7
    wander: float = 0.08
    weeks: float = 10.0

    name: ClassVar[str] = "false_house"
    what: ClassVar[str] = (
        "One house interviews nobody: every week it prints the mean of the others' polls of the last three "
        "weeks, moved by a course of its own, and claims 4,000 interviews."
    )

    def change_register(self, register: Register, *, country: Country, rng: np.random.Generator) -> Register:
        """Add the false house's polls."""
        scenery = country.scenery
        honest: list[dict[str, object]] = register.polls.to_dict("records")  # type: ignore[assignment]
        scale = self.wander * np.sqrt(0.15 / country.last_shares)
        kept = np.exp(-self.every_days / 7 / self.weeks)
        away = scale * rng.normal(size=scale.size)
        rows: list[dict[str, object]] = []
        for end in self._days(scenery.first_fieldwork, scenery.register_end):
            away = kept * away + np.sqrt(1 - kept**2) * scale * rng.normal(size=scale.size)
            sample = int(self.sample * rng.uniform(0.9, 1.1))
            seen = recent_polls(honest, day=end, house=self.house)
            if len(seen) < FEWEST_POLLS:
                continue
            figures = field_mean(seen, scenery=scenery, last_shares=country.last_shares) * np.exp(away)
            figures *= 100 / figures.sum()
            printed = [printed_figure(share, grid=GRID) for share in figures]
            rows.append(
                {
                    "poll": f"H0-{len(rows) + 1:03d}",
                    "house": self.house,
                    "sponsor": "",
                    "start": str(end - timedelta(days=FIELDWORK_DAYS - 1)),
                    "end": str(end),
                    "published": str(end + timedelta(days=1)),
                    "question": "vote",
                    "region": "",
                    "sample": sample,
                    "mode": "online",
                    "population": "voters",
                    "status": "final",
                    "source": f"release {end + timedelta(days=1)}",
                    **dict(zip(scenery.codes, printed, strict=True)),
                }
            )
        added = pd.DataFrame(rows, columns=register.polls.columns)
        polls = pd.concat([register.polls, added.astype(register.polls.dtypes.to_dict())])
        polls = polls.sort_values(["published", "poll"], kind="stable", ignore_index=True)
        return replace(register, polls=polls)

    def _days(self, first: date, last: date) -> list[date]:
        """Last days of its fieldwork."""
        count = (last - first).days // self.every_days
        return [last - timedelta(days=1 + self.every_days * k) for k in range(count)][::-1]
