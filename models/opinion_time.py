r"""Opinion time: how much opinion may move between two days, in usual weeks.

A calendar week is a week of opinion time, except that a jolt adds some on its day and that time may run
faster or slower towards polling day:

.. math:: d\tau/dt = \exp(g\,s(t)), \quad s(t) = \max(0, 1 - (T - t)/60)

with T polling day, t in days, and the log height g of the ramp centred on zero: whether campaigns stir
opinion or settle it, the polls may say. Over one step between knots s is taken at its mean.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pymc as pm

from models.arrays import Floats
from models.priors import Priors

Array = Any

RAMP_DAYS = 60.0


def ramp_strength(first_day: Floats, last_day: Floats, *, polling_day: float) -> Floats:
    """Mean of s(t) between days; dims as given, 0–1.

    Parameters
    ----------
    first_day, last_day
        Ends of the stretches, days on one scale with ``polling_day``, none after it.
    """

    def area(day: Floats) -> Floats:
        # Integral of s from the foot of the ramp.
        return np.asarray(np.maximum(day - (polling_day - RAMP_DAYS), 0) ** 2 / (2 * RAMP_DAYS))

    return (area(last_day) - area(first_day)) / np.maximum(last_day - first_day, 1e-12)


def opinion_weeks(step: Array, *, jolt: Array, ramp: Array, log_height: Array, exp: Callable) -> Array:
    """Opinion time of each step, weeks; dims (…, step).

    Parameters
    ----------
    step
        Calendar weeks, dims (step).
    jolt
        Weeks added by jolts, dims (step).
    ramp
        Mean of s over the step, dims (step).
    log_height
        g, dims (…, 1) or a scalar.
    exp
        The elementwise exponential to use.
    """
    return step * exp(log_height * ramp) + jolt


def add_ramp(*, priors: Priors) -> Array:
    """Put the log height of the ramp into the current model; scalar."""
    return pm.Normal("ramp_log_height", 0, priors.ramp_log_sd)
