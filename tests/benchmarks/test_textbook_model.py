"""The benchmark's reference has the same posterior as the election model, prior and likelihood."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pymc as pm
import pytest
from pymc.model.transform.conditioning import remove_value_transforms

from aggregator.estimate.parameters import Parameters
from aggregator.estimate.poll_fit import row_log_likelihood
from models.arrays import ElectionArrays
from models.block_geometry import Geometry, build_geometry
from models.election_model import build_election_model
from models.free_baseline import free_directions
from models.priors import Priors
from tests.benchmarks.textbook_model import NATURAL, build_textbook_model
from tests.models.made_up_arrays import made_up_arrays

CASES = {
    "anchored": {"free": 1, "absent": True},
    "no last result": {"anchored": False},
    "one region": {"regions": 1, "free": 1},
    "one house": {"houses": 1},
    "messy": {"messy": True, "free": 1},
}
PRIORS = Priors()
Point = dict[str, np.ndarray]


def small_election(**case: int | bool) -> ElectionArrays:
    """A small election, its lowest figures only known to the half point."""
    arrays, _ = made_up_arrays(polls=25, weeks=16, **case)
    rows = arrays.rows
    share = np.where(rows.used > 0, rows.answers / rows.respondents[:, None], 1)
    row, cell = np.nonzero(share < np.quantile(share, 0.1))
    count, half = rows.answers[row, cell], 0.005 * rows.respondents[row]
    intervals = {"small_row": row, "small_cell": cell, "small_low": count - half, "small_high": count + half}
    return replace(arrays, rows=replace(rows, **intervals))


def random_point(model: pm.Model, rng: np.random.Generator) -> Point:
    """Standard normals without the part that centring over regions, houses, eras or modes takes away."""
    point = {
        name: np.asarray(value + 0.5 * rng.normal(size=np.shape(value)))
        for name, value in sorted(model.initial_point().items())
    }
    for name in ("region_steps", "house_effects", "era_effects", "mode_effects"):
        if name in point:
            point[name] -= point[name].mean(axis=-2, keepdims=True)
    return point


def compile_with_natural(textbook: pm.Model, outputs: list) -> Callable[[Point], list]:
    """The textbook model's outputs, followed by its natural parameters, at a point."""
    natural = textbook.replace_rvs_by_values([textbook[name] for name in NATURAL])
    return textbook.compile_fn(
        [*outputs, *natural], mode="FAST_COMPILE", inputs=textbook.value_vars, on_unused_input="ignore"
    )


def in_natural_modes(model: pm.Model) -> pm.Model:
    """The election model without its sampling coordinates."""
    for variable in model.free_RVs:
        # A copy of a model cannot carry starting values, and none are needed here.
        model.rvs_to_initial_values[variable] = None
    return remove_value_transforms(model)


def modes_at(natural: Point, *, arrays: ElectionArrays, geometry: Geometry) -> Point:
    """The election model's modes at the textbook model's natural parameters."""

    def unit_steps(walk: np.ndarray, level: str) -> np.ndarray:
        step, jolt, up = (getattr(arrays.knots, f"{level}_{part}") for part in ("step", "jolt", "ramp"))
        time = step * np.exp(natural["ramp"] * up) + jolt
        return np.diff(walk, axis=0) / np.sqrt(time).reshape(-1, *[1] * (walk.ndim - 1))

    modes = {"national_modes": geometry.national.basis.T @ unit_steps(natural["walk"], "national")}
    if geometry.region is not None:
        contrast = np.linalg.pinv(geometry.region_contrast) @ unit_steps(natural["region"], "region")
        modes["region_modes"] = geometry.region.basis.T @ contrast.reshape(-1, len(arrays.country.parties))
    if geometry.lean is not None:
        modes["lean_modes"] = np.linalg.lstsq(geometry.lean.basis, natural["terms"][:-1], rcond=None)[0]
    return modes


def free_starts_at(point: Point, *, arrays: ElectionArrays) -> Point:
    """The textbook's starts of free parties in the election model's directions."""
    turn = free_directions(arrays.country)[:, arrays.country.free_party].T
    names = ("free_baseline_own", "free_region_baseline_own")
    return {name: point[name] @ turn for name in names if name in point}


@pytest.mark.parametrize("case", CASES)
def test_textbook_model_has_the_same_posterior(case: str) -> None:
    arrays = small_election(**CASES[case])
    geometry = build_geometry(arrays, priors=PRIORS)
    ours = in_natural_modes(build_election_model(arrays, geometry=geometry, priors=PRIORS))
    textbook = build_textbook_model(arrays, priors=PRIORS)
    our_values = [ours.rvs_to_values[variable] for variable in ours.free_RVs]
    our_density = ours.compile_fn(ours.logp(), mode="FAST_COMPILE", point_fn=False, inputs=our_values)
    textbook_at = compile_with_natural(textbook, [textbook.logp()])

    gaps, rng = [], np.random.default_rng(3)
    for _ in range(3):
        point = random_point(textbook, rng)
        density, *values = textbook_at(point)
        natural = dict(zip(NATURAL, values, strict=True))
        at = point | free_starts_at(point, arrays=arrays)
        at |= modes_at(natural, arrays=arrays, geometry=geometry)
        # Ours is a density of modes in units of log support, the textbook's of standard normals.
        scales = {
            "national_modes": natural["drift"],
            "region_modes": natural["drift"] * natural["region_ratio"],
            "lean_modes": natural["house_scale"],
        }
        jacobian = sum(at[name].shape[0] * np.log(s).sum() for name, s in scales.items() if name in at)
        gaps.append(density - float(our_density(*[at[v.name] for v in ours.free_RVs])) - jacobian)
    # What remains are the standard normals that centring removes: a constant.
    parties = len(arrays.country.parties)
    centred = 1 + len(set(arrays.leans.era_house)) + (len(arrays.leans.modes) > 0)
    removed = parties * ((len(arrays.knots.region_day) - 1) * (geometry.region is not None) + centred)
    assert gaps == pytest.approx([-0.5 * np.log(2 * np.pi) * removed] * 3, abs=1e-6)


def test_output_step_reads_the_textbook_draws_with_the_same_likelihood() -> None:
    arrays = small_election(free=1, absent=True)
    textbook = build_textbook_model(arrays, priors=PRIORS)
    likelihood_at = compile_with_natural(textbook, textbook.replace_rvs_by_values(textbook.potentials))
    answers, small, *values = likelihood_at(random_point(textbook, np.random.default_rng(4)))
    parameters = Parameters(**{name: value[None] for name, value in zip(NATURAL, values, strict=True)})
    likelihood = row_log_likelihood(parameters, arrays=arrays, samples=np.array([0]))[0]
    np.add.at(answers, arrays.rows.small_row, small)
    assert likelihood == pytest.approx(answers, rel=1e-10)
