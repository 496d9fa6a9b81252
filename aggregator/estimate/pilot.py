"""A pilot: the posterior mode of the support paths and leans with the scales held at their prior medians.

The pilot moves the sampler's coordinates so that their origin is that mode. It changes no density: the test
of this module compares both.
"""

from __future__ import annotations

import numpy as np
import pymc as pm
from scipy.optimize import minimize

from aggregator.estimate.log_density import LogDensity
from models.arrays import ElectionArrays, Floats
from models.block_geometry import Geometry
from models.conditional_laplace import answer_information, modes_from_coordinates, pull_towards
from models.free_baseline import free_directions, is_free
from models.party_scales import size_factor
from models.priors import Priors
from models.shared_lean import lean_loadings, lean_scale

MOST_STEPS = 80
# Curvature pairs that L-BFGS keeps.
MEMORY = 15
SUPPORT_VARIABLES = (
    "national_modes",
    "region_modes",
    "lean_modes",
    "shared_lean_ends",
    "free_baseline_own",
    "free_region_baseline_own",
)


def centre_on_pilot(
    model: pm.Model,
    density: LogDensity,
    *,
    arrays: ElectionArrays,
    geometry: Geometry,
    priors: Priors,
) -> Floats:
    """Find the pilot mode and make it the origin of the Gaussian blocks' coordinates.

    Sets the model's ``…_pull`` data.

    Returns
    -------
    The starting point of the chains, dims (coordinate).
    """
    point = _mode(density)
    scales = _pilot_scales(arrays, priors)
    layout, country = density.layout, arrays.country
    beside, region_start = _beside(point, density=density, arrays=arrays, priors=priors, scales=scales)
    blocks = {
        "national_modes": (geometry.national, scales["drift"], beside),
        "region_modes": (geometry.region, scales["region"], region_start),
        "lean_modes": (geometry.lean, scales["house"], None),
    }
    for name, (block, scale, other) in blocks.items():
        if block is None:
            continue
        follow = (
            0.0 if other is None else answer_information(block.crossing @ other, share=country.pilot_share)
        )
        pull_name = name.replace("_modes", "_pull")
        modes = modes_from_coordinates(
            layout.part(point, name),
            scale=scale,
            information=block.information,
            share=country.pilot_share,
            pull=model[pull_name].get_value() - follow,
        )
        pull = pull_towards(modes, scale=scale, information=block.information, share=country.pilot_share)
        model[pull_name].set_value(pull + follow)
        point[layout.place(name)] = 0
    return point


def _mode(density: LogDensity) -> Floats:
    layout = density.layout
    start = density.start.copy()
    free = np.zeros(layout.size, dtype=bool)
    for name in layout.names:
        if name in SUPPORT_VARIABLES:
            free[layout.place(name)] = True

    def negative(part: Floats) -> tuple[float, Floats]:
        vector = start.copy()
        vector[free] = part
        value, gradient = density(vector)
        return -value, -gradient[free]

    found = minimize(
        negative, start[free], jac=True, method="L-BFGS-B", options={"maxiter": MOST_STEPS, "maxcor": MEMORY}
    )
    start[free] = found.x
    return start


def _pilot_scales(arrays: ElectionArrays, priors: Priors) -> dict[str, Floats]:
    size = size_factor(arrays.country.reference_share)
    drift = np.exp(priors.drift_log_median) * size
    return {
        "drift": drift,
        "region": drift * priors.region_ratio_median,
        "house": np.exp(priors.house_log_median) * size,
    }


def _beside(
    point: Floats, *, density: LogDensity, arrays: ElectionArrays, priors: Priors, scales: dict[str, Floats]
) -> tuple[Floats | None, Floats | None]:
    """What polls see nationally and by region beside the walks, at the pilot; None where there is nothing."""
    layout, country, knots = density.layout, arrays.country, arrays.knots
    beside = np.zeros((len(knots.lean_clock), len(country.parties)))
    reference = np.zeros(len(country.parties))
    lean = "shared_lean_ends" in layout.names
    free = free_directions(country)
    if lean:
        scale = lean_scale(
            lean_size=country.lean_size,
            reference_share=country.reference_share,
            house_scale=scales["house"],
            house_count=len(arrays.rows.houses),
        )
        ends = layout.part(point, "shared_lean_ends") * scale
        beside += lean_loadings(knots.lean_clock, correlation=priors.lean_correlation) @ ends
        reference = lean_loadings(np.array(knots.lean_reference), correlation=priors.lean_correlation) @ ends
    if len(free):
        own = layout.part(point, "free_baseline_own")
        beside += (priors.free_log_sd * own) @ free - reference * is_free(country)
    region_start = None
    if "free_region_baseline_own" in layout.names:
        region_start = (priors.free_region_log_sd * layout.part(point, "free_region_baseline_own")) @ free
    return (beside if lean or len(free) else None), region_start
