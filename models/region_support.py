r"""How a region's own support departs from the country's.

A region's own support E is its last result moved by its own swing d and fitted to two sets of sums: the
shares of a region sum to one, and the turnout-weighted sum of a party over regions stays the last result's.
The fitting is iterative proportional fitting (Deming & Stephan 1940, Annals of Mathematical Statistics
11:427–444), two rounds of it, so that the second sum holds exactly and the first nearly.

A swing between regions then leaves the national sum alone, however large it is, and the national swing means
what it says. Without the fitting, large regional swings would move national support to second order; where
polls say little of regions, that bends the posterior into a funnel over the scale of regional swings.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt

from models.priors import Priors

Array = Any

ROUNDS = 2


def own_support(own: Array, *, start_share: Array, turnout: Array, exp: Callable) -> Array:
    """Each region's own support E; zero where a party does not stand.

    Parameters
    ----------
    own
        The region's own swing d and free start, log units, dims (…, region, party).
    start_share
        Last result, zero where a party does not stand, dims (region, party).
    turnout
        Share of each region in the votes, dims (region), sums to one.
    exp
        The elementwise exponential to use.

    Returns
    -------
    E, dims (…, region, party).
    """
    weight = turnout[:, None]
    national = (weight * start_share / start_share.sum(axis=-1, keepdims=True)).sum(axis=0)
    support = start_share * exp(own)
    for _ in range(ROUNDS):
        support = support / support.sum(axis=-1, keepdims=True)
        support = support * (national / (weight * support).sum(axis=-2))[..., None, :]
    return support


def region_ratio(own: Array, *, priors: Priors, exp: Callable) -> Array:
    """A region's drift over the national one, between zero and ``priors.region_ratio_most``.

    Parameters
    ----------
    own
        Standard normal, any dims.
    """
    odds = priors.region_ratio_median / (priors.region_ratio_most - priors.region_ratio_median)
    return priors.region_ratio_most / (1 + exp(-(np.log(odds) + priors.region_ratio_spread * own)))


def add_region_ratio(*, priors: Priors) -> Array:
    """Put the ratio of regional to national drift into the current model; scalar."""
    return region_ratio(pm.Normal("region_ratio_own", 0, 1), priors=priors, exp=pt.exp)
