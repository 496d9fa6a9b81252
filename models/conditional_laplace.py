r"""Coordinates in which a Gaussian block of the model is nearly a standard normal.

Each Gaussian block (the national walk, the regional walks, the house effects) is written as
field = V c. The columns of V are the eigenvectors that make both the prior and the polls' information
diagonal over modes, so that mode j of c has the prior N(0, diag σ²) over parties and about
the information e_j (diag m − m mᵀ), m the parties' rough shares. Given σ, the posterior of a mode is
then close to a normal with precision

.. math:: \Lambda_j = \mathrm{diag}(1/\sigma^2) + e_j(\mathrm{diag}\,m - m m^\top)

and mean :math:`\Lambda_j^{-1} r_j`. The sampler moves in g, with c = S g + S Sᵀ r and S Sᵀ = Λ⁻¹.
Λ is a diagonal minus a matrix of rank one, so its root has a closed form and costs no factorisation. The
model itself does not change: c stays normal with scale σ, and only the coordinates of the sampler do.

All functions below work on numpy arrays and on pytensor tensors alike, with leading dims of any
number in numpy: the sampler and the code that turns its draws into support share one formula.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt
from pymc.distributions.transforms import Transform

Array = Any


def _root(scale: Array, information: Array, share: Array) -> tuple[Array, Callable, Callable]:
    """Diagonal part of the root S of Λ⁻¹, its rank-one part, and the inverse of the latter."""
    prior_precision = scale[..., None, :] ** -2
    precision = prior_precision + information[..., :, None] * share
    diagonal = precision**-0.5
    # One minus |v|², computed as a sum of positive terms so that it never cancels.
    rest = (share * prior_precision / precision).sum(axis=-1, keepdims=True) ** 0.5
    v = diagonal * share * information[..., :, None] ** 0.5

    def outward(z: Array) -> Array:
        return z + v * (v * z).sum(axis=-1, keepdims=True) / (rest * (1 + rest))

    def inward(z: Array) -> Array:
        return z - v * (v * z).sum(axis=-1, keepdims=True) / (1 + rest)

    return diagonal, outward, inward


def modes_from_coordinates(
    coordinates: Array, *, scale: Array, information: Array, share: Array, pull: Array
) -> Array:
    """Turn sampling coordinates g into modes c.

    Parameters
    ----------
    coordinates
        g, dims (mode, party).
    scale
        Prior scale σ, dims (party).
    information
        e, dims (mode).
    share
        m, dims (party), sums to one.
    pull
        r, dims (mode, party): precision times mean.
    """
    diagonal, outward, _ = _root(scale, information, share)
    return diagonal * outward(coordinates + outward(diagonal * pull))


def coordinates_from_modes(
    modes: Array, *, scale: Array, information: Array, share: Array, pull: Array
) -> Array:
    """Turn modes c into sampling coordinates g; the inverse of :func:`modes_from_coordinates`."""
    diagonal, outward, inward = _root(scale, information, share)
    return inward(modes / diagonal) - outward(diagonal * pull)


def pull_towards(modes: Array, *, scale: Array, information: Array, share: Array) -> Array:
    """The r for which g = 0 means exactly these modes: Λ c, dims (mode, party)."""
    return modes * scale**-2 + information[..., :, None] * answer_information(modes, share=share)


def answer_information(field: Array, *, share: Array) -> Array:
    """Apply diag m − m mᵀ, what one answer tells about log support, to each row of a field."""
    weighted = field * share
    return weighted - share * weighted.sum(axis=-1, keepdims=True)


class ConditionalLaplace(Transform):
    """The change of coordinates of this module as a PyMC transform of the modes."""

    name = "conditional_laplace"
    ndim_supp = 2

    def backward(self, value: Array, *inputs: Array) -> Array:
        """Coordinates to modes."""
        scale, information, share, pull = inputs[-4:]
        return modes_from_coordinates(value, scale=scale, information=information, share=share, pull=pull)

    def forward(self, value: Array, *inputs: Array) -> Array:
        """Modes to coordinates."""
        scale, information, share, pull = inputs[-4:]
        return coordinates_from_modes(value, scale=scale, information=information, share=share, pull=pull)

    def log_jac_det(self, value: Array, *inputs: Array) -> Array:
        """Log of |∂c/∂g| = log|S|."""
        scale, information, share, _ = inputs[-4:]
        prior_precision = scale[None, :] ** -2
        precision = prior_precision + information[:, None] * share
        rest = (share * prior_precision / precision).sum(axis=-1)
        return -0.5 * pt.log(precision).sum(axis=(-1, -2)) - 0.5 * pt.log(rest).sum(axis=-1)


def _log_density(modes: Array, scale: Array, information: Array, share: Array, pull: Array) -> Array:
    return (-0.5 * (modes / scale) ** 2 - pt.log(scale) - 0.5 * np.log(2 * np.pi)).sum(axis=(-1, -2))


def _draw(
    scale: Array, information: Array, share: Array, pull: Array, rng: Any = None, size: Any = None
) -> Array:
    return rng.normal(size=np.shape(pull)) * scale


def add_modes(
    name: str, *, scale: Array, information: Array, share: Array, pull: Array, dims: tuple[str, str]
) -> Array:
    """Put the modes of a Gaussian block into the current model: normal with scale σ, dims (mode, party).

    ``information``, ``share`` and ``pull`` steer the sampler's coordinates only.
    """
    model = pm.modelcontext(None)
    shape = tuple(len(model.coords[dim]) for dim in dims)
    return pm.CustomDist(
        name,
        scale,
        information,
        share,
        pull,
        logp=_log_density,
        random=_draw,
        signature="(p),(j),(p),(j,p)->(j,p)",
        initval=np.zeros(shape),
        default_transform=ConditionalLaplace(),
        dims=dims,
    )
