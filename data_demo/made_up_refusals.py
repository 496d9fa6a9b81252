"""Refusals that follow a party: its voters talk to no interviewer, whoever sends him."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np

from data_demo.made_up_country import Country
from data_demo.made_up_violation import Violation


@dataclass(frozen=True)
class PartisanRefusals(Violation):
    """Since the last election the voters of one party have refused twice as often as all others.

    Attributes
    ----------
    refusal
        Part of the others' voters that refuse; twice that of the party's. With 15 % a party loses nearly a
        fifth of its voters to every poll: 4 points of 30.
    """

    refusal: float = 0.15

    name: ClassVar[str] = "partisan_refusals"
    what: ClassVar[str] = (
        "Since the last election the voters of one party refuse every house twice as often as all others: "
        "30 % of them do, 15 % of the rest."
    )

    def change_country(self, country: Country, *, rng: np.random.Generator) -> Country:
        """Let a party drawn by its last share lose in every poll after the last election."""
        parties = np.array([not p.is_new for p in country.scenery.parties] + [False])
        chance = np.where(parties, country.last_shares, 0.0)
        party = int(rng.choice(chance.size, p=chance / chance.sum()))
        lean = country.lean.copy()
        lean[1:, :, party] += np.log((1 - 2 * self.refusal) / (1 - self.refusal))
        return replace(country, lean=lean)
