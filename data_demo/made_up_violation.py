"""What may go wrong in an invented election that nobody who reads its polls is told of."""

from __future__ import annotations

from typing import ClassVar

import numpy as np

from data_demo.made_up_country import Country
from data_demo.made_up_leans import HouseTruth
from data_demo.made_up_polls import Register
from data_demo.made_up_scenery import Scenery


class Violation:
    """A change to an election on its way from scenery to register; this one changes nothing.

    A violation overrides the stage it disturbs. The stages before it, and the voters wherever it does not
    disturb them, stay as the seed drew them, so that the same seed with and without a violation is a pair.
    The truth is told of the changed election.

    Attributes
    ----------
    name
        What a command calls it.
    what
        What happens, in a sentence.
    """

    name: ClassVar[str] = ""
    what: ClassVar[str] = ""

    def change_scenery(self, scenery: Scenery) -> Scenery:
        """Change what stands before anything is drawn."""
        return scenery

    def change_country(self, country: Country, *, rng: np.random.Generator) -> Country:
        """Change the voters, or what all houses get wrong about them."""
        return country

    def change_houses(self, houses: HouseTruth) -> HouseTruth:
        """Change how the houses work."""
        return houses

    def change_register(self, register: Register, *, country: Country, rng: np.random.Generator) -> Register:
        """Change what is published."""
        return register
