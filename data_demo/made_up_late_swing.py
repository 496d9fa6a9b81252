"""A sudden swing in the last week, after the last poll."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import timedelta
from typing import ClassVar

import numpy as np

from data_demo.made_up_country import Country, log_softmax
from data_demo.made_up_violation import Violation

LAST_DAYS = 7


@dataclass(frozen=True)
class LateSwing(Violation):
    """On one of the last seven days, after the last publication, support moves everywhere at once.

    Attributes
    ----------
    points_at_40
        Sd of the move for a party of 40 %, in points; other parties move as √(p(1−p)) does. 3 points are more
        than the 2.5 by which all polls together are usually wrong.
    """

    points_at_40: float = 3.0

    name: ClassVar[str] = "late_swing"
    what: ClassVar[str] = (
        "After the last poll, on one of the last seven days, support moves at once (3 points, one standard "
        "deviation, for a party of 40 %)."
    )

    def change_country(self, country: Country, *, rng: np.random.Generator) -> Country:
        """Move support on and after a day drawn between the last publication and polling day."""
        polling_day = country.day_number(country.scenery.polling_day)
        after_polls = country.day_number(country.scenery.register_end) + 1
        day = int(rng.integers(max(after_polls, polling_day - LAST_DAYS + 1), polling_day + 1))
        scale = self.points_at_40 / 100 / np.sqrt(0.24) / np.sqrt(country.last_shares)
        move = scale * rng.normal(size=scale.size)
        unvoted = country.scenery.regions_voting_after(country.days[day].date() - timedelta(days=1))
        still_to_vote = np.isin(country.scenery.region_codes, unvoted)
        log_support = country.log_support.copy()
        log_support[day:, still_to_vote] = log_softmax(log_support[day:, still_to_vote] + move)
        return replace(country, log_support=log_support)
