"""Regions that have voted and been counted, as evidence about the others.

A count shows a region's true support on its polling day, without house and without shared lean: against
the polls of that region and of the country it tells the error that all polls share. But the regions' own
parts of that error differ, and those parts are not in the model: they are drawn beside it. So a count enters
as a simple random sample whose variance is that of the regional part: of 1/(part · c)² people.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt

from models.arrays import Floats
from models.priors import Priors

Array = Any

# Without any lean a count would be exact; a sample of this size is, beside all else.
MOST_PEOPLE = 20_000.0


def people_of_a_count(lean_size: Floats, *, pilot_share: Floats, priors: Priors) -> float:
    """How many randomly drawn people a region's count is worth.

    Parameters
    ----------
    lean_size
        Size c of the shared lean, dims (party), log units × √p; zero without one.
    pilot_share
        Rough national support, dims (party).
    """
    size = priors.region_lean_part * float(pilot_share @ lean_size)
    return min(MOST_PEOPLE, size**-2) if size > 0 else MOST_PEOPLE


def add_counts(*, share: Array, counted: Array, people: Array) -> Array:
    """Put the counted shares into the current model; dims of both shares (counted, party)."""

    def log_density(value: Array, share: Array, people: Array) -> Array:
        # A party that does not stand has neither votes nor support.
        return people * pt.switch(value > 0, value * pt.log(pt.maximum(share, 1e-12)), 0).sum(axis=-1)

    def draw(share: Array, people: Array, rng: Any = None, size: Any = None) -> Array:
        whole = np.round(people).astype(int)
        return np.stack([rng.multinomial(whole, q / q.sum()) / whole for q in share])

    return pm.CustomDist(
        "counts", share, people, logp=log_density, random=draw, signature="(p),()->(p)", observed=counted
    )
