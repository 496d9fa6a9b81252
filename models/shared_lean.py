r"""The error that all polls share, which polls alone cannot see.

.. math:: \psi(t) = l_p\,(\cos(f\Omega)\,u + \sin(f\Omega)\,v), \quad u, v \sim N(0, I)

with f running from 0 at the last result to 1 on polling day and Ω the arc cosine of the assumed correlation
between the two. The variance is l_p² at every time. l_p goes as 1/√p in log units, hence as √(p(1−p)) in
share, for a party and for any sum of parties. With few houses their unseen common mean is a shared error too:
τ_p²/H is added to the variance.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt

from models.arrays import Floats
from models.priors import Priors

Array = Any


def lean_loadings(clock: Floats, *, correlation: float) -> Floats:
    """cos(fΩ) and sin(fΩ), dims (…, end)."""
    angle = np.arccos(correlation)
    return np.stack([np.cos(clock * angle), np.sin(clock * angle)], axis=-1)


def lean_size(recorded: Floats, *, undecided: float, priors: Priors) -> Floats:
    """Size c of the shared lean, log units × √p; dims (party).

    Setting the undecided aside takes them to split as the others do. They may not, and no poll shows it: what
    they may add is a shared error of the undecided share times how far they may stray.

    Parameters
    ----------
    recorded
        c as the record of past elections has it, dims (party).
    undecided
        Undecided share of the late polls, 0–1.
    """
    return np.sqrt(recorded**2 + (undecided * priors.undecided_stray) ** 2)


def lean_scale(*, lean_size: Array, reference_share: Array, house_scale: Array, house_count: Array) -> Array:
    """Standard deviation l_p of the shared lean, dims (party), unit: log support."""
    return (lean_size**2 / reference_share + house_scale**2 / house_count) ** 0.5


def add_shared_lean(*, loadings: Array, scale: Array) -> Array:
    """Put the shared lean into the current model; returns it at the national knots, dims (knot, party)."""
    ends = pm.Normal("shared_lean_ends", 0, 1, dims=("lean_end", "party"))
    return pt.dot(loadings, ends * scale)
