"""Scales that differ by party but are pulled to a common one: σ_p = exp(log scale + spread·z_p)·√(.15/p)."""

from __future__ import annotations

from typing import Any

import pymc as pm
import pytensor.tensor as pt

from models.priors import SCALE_SHARE

Array = Any


def size_factor(reference_share: Array) -> Array:
    """√(.15/p): in points, scales then go about as √(p(1−p)); dims (party)."""
    return (SCALE_SHARE / reference_share) ** 0.5


def add_party_scale(
    name: str, *, log_median: float, log_sd: float, spread: float, reference_share: Array
) -> Array:
    """Put a hierarchical party-level scale into the current model; dims (party), unit: log support."""
    common = pm.Normal(f"{name}_log", log_median, log_sd)
    own = pm.Normal(f"{name}_own", 0, 1, dims="party")
    return pt.exp(common + spread * own) * size_factor(reference_share)
