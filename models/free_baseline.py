"""Where a party without a last result starts.

Polls tell such a party's support only as they see it, shared lean included, and no record exists against
which the lean could show. So the free parameter is its *polled* start; its true start is
that less the lean of the register's middle. The prior is wide (log-sd 1.2) beside the lean.
"""

from __future__ import annotations

from typing import Any

import pymc as pm
import pytensor.tensor as pt

Array = Any


def add_free_baseline(*, free: Array, log_sd: float) -> Array:
    """Put the national polled start of the free parties, around its prior median, into the model.

    Parameters
    ----------
    free
        One where column f is party p, dims (free party, party).

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
