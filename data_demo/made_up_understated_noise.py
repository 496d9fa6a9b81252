"""Houses that claim far more precision than they have."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np

from data_demo.made_up_country import Country
from data_demo.made_up_leans import HouseTruth
from data_demo.made_up_polls import Register
from data_demo.made_up_scenery import Scenery
from data_demo.made_up_violation import Violation


@dataclass(frozen=True)
class UnderstatedNoise(Violation):
    """Every house prints effective sample sizes, and strays with a multiple of the variance they claim.

    Attributes
    ----------
    times
        True variance of a house's figures over the claimed one.
    """

    times: float = 3.0

    name: ClassVar[str] = "understated_noise"
    what: ClassVar[str] = (
        "Every house prints an effective sample size, and its figures have three times the variance that "
        "this size and its usual floor of error claim."
    )

    def change_scenery(self, scenery: Scenery) -> Scenery:
        """Let every house print effective sizes."""
        return replace(scenery, houses=tuple(replace(h, gives_effective=True) for h in scenery.houses))

    def change_houses(self, houses: HouseTruth) -> HouseTruth:
        """Raise every design effect."""
        return replace(houses, kappa=self.times * houses.kappa, rho=self.times * houses.rho)

    def change_register(self, register: Register, *, country: Country, rng: np.random.Generator) -> Register:
        """Print the effective size that the claimed design effect would leave."""
        polls = register.polls.copy()
        polls["effective"] = (self.times * polls["effective"].astype(float)).round()
        return replace(register, polls=polls)
