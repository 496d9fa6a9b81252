"""How much less a poll tells than a simple random sample of its size.

deff = κ + (N − 1) ρ, with κ ≥ 1 what weighting costs (Kish 1965, *Survey Sampling*), ρ a floor of error that
no sample size removes, and N the size of the whole poll, so that entering a poll as its regional rows counts
nobody twice. Polls tell deff at a house's usual size well, κ and ρ apart hardly at all.
"""

from __future__ import annotations

from typing import Any

import pymc as pm
import pytensor.tensor as pt

from models.priors import Priors

Array = Any


def add_design_effect_parameters(*, priors: Priors) -> tuple[Array, Array]:
    """Put κ and ρ of each house into the current model; dims (house) each."""
    loss = pm.Normal(
        "weighting_loss_log", priors.weighting_loss_log_median, priors.weighting_loss_log_sd
    ) + priors.weighting_loss_spread * pm.Normal("weighting_loss_own", 0, 1, dims="house")
    floor = pm.Normal(
        "error_floor_log", priors.error_floor_log_median, priors.error_floor_log_sd
    ) + priors.error_floor_spread * pm.Normal("error_floor_own", 0, 1, dims="house")
    return 1 + pt.exp(loss), pt.exp(floor)


def row_design_effect(
    *, kappa: Array, rho: Array, house_of_row: Array, poll_respondents: Array, weighting_known: Array
) -> Array:
    """Design effect of each row, dims (…, row); κ is one where the desk gave an effective sample."""
    loss = 1 + (kappa[..., house_of_row] - 1) * (1 - weighting_known)
    return loss + (poll_respondents - 1) * rho[..., house_of_row]
