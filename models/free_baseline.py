"""Where a party without a last result starts.

Polls tell such a party's support only as they see it, shared lean included, and no record exists against
which the lean could show. So the free parameter is its *polled* start; its true start is
that less the lean of the register's middle. The prior is wide (log-sd 1.2) beside the lean.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt

from models.arrays import CountryArrays, Floats

Array = Any


def free_directions(country: CountryArrays) -> Floats:
    """Directions in which the starts of the free parties are drawn; orthonormal, dims (direction, party).

    Each free party has its own, unless no party has a record: then only differences between starts show, and
    the first direction is the level all parties share, which would otherwise tie their starts together.
    """
    size = len(country.parties)
    if len(country.free_party) < size:
        return np.eye(size)[country.free_party]
    level_first = np.column_stack([np.ones(size), np.eye(size)[:, :-1]])
    return np.ascontiguousarray(np.linalg.qr(level_first)[0].T)


def is_free(country: CountryArrays) -> Floats:
    """One for parties without a last result, dims (party)."""
    return np.isin(np.arange(len(country.parties)), country.free_party).astype(float)


def add_free_baseline(*, free: Array, log_sd: float) -> Array:
    """Put the national polled start of the free parties, around its prior median, into the model.

    Parameters
    ----------
    free
        Directions of the free starts, dims (free party, party).

    Returns
    -------
    dims (party), log support, zero for anchored parties.
    """
    own = pm.Normal("free_baseline_own", 0, 1, dims="free_party")
    return pt.dot(log_sd * own, free)


def add_free_region_baseline(*, free: Array, log_sd: float) -> Array:
    """Put each region's distance from the national start into the model; dims (region, party)."""
    own = pm.Normal("free_region_baseline_own", 0, 1, dims=("region", "free_party"))
    return pt.dot(log_sd * own, free)
