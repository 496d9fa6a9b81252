"""The sampler's coordinates change nothing but the coordinates."""

from __future__ import annotations

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest
from hypothesis import given
from hypothesis import strategies as st

from models.conditional_laplace import (
    ConditionalLaplace,
    coordinates_from_modes,
    modes_from_coordinates,
    pull_towards,
)

MODES, PARTIES = 3, 4


def _block(seed: int) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(seed)
    return {
        "scale": np.exp(rng.normal(-3, 1, size=PARTIES)),
        "information": np.exp(rng.normal(3, 4, size=MODES)),
        "share": rng.dirichlet(np.ones(PARTIES)),
        "pull": rng.normal(size=(MODES, PARTIES)) * 20,
    }


@given(seed=st.integers(0, 10_000))
def test_modes_and_coordinates_are_inverse_to_each_other(seed: int) -> None:
    block = _block(seed)
    coordinates = np.random.default_rng(seed + 1).normal(size=(MODES, PARTIES))
    modes = modes_from_coordinates(coordinates, **block)
    np.testing.assert_allclose(coordinates_from_modes(modes, **block), coordinates, atol=1e-6)


@given(seed=st.integers(0, 10_000))
def test_a_standard_normal_becomes_the_posterior_given_the_blocks_information(seed: int) -> None:
    """Mean and covariance against a dense inverse of diag(1/σ²) + e (diag m − m mᵀ)."""
    block = _block(seed)
    for mode in range(MODES):
        share = block["share"]
        precision = np.diag(block["scale"] ** -2) + block["information"][mode] * (
            np.diag(share) - np.outer(share, share)
        )
        covariance = np.linalg.inv(precision)
        centre = modes_from_coordinates(np.zeros((MODES, PARTIES)), **block)[mode]
        np.testing.assert_allclose(centre, covariance @ block["pull"][mode], rtol=1e-6, atol=1e-12)
        root = np.stack(
            [modes_from_coordinates(_unit(mode, p), **block)[mode] - centre for p in range(PARTIES)], axis=1
        )
        np.testing.assert_allclose(root @ root.T, covariance, rtol=1e-5, atol=1e-9 * np.abs(covariance).max())


def test_the_log_jacobian_is_that_of_the_change_of_coordinates() -> None:
    block = _block(5) | {"information": np.array([1e-9, 30.0, 4000.0])}
    inputs = [pt.as_tensor_variable(block[name]) for name in ("scale", "information", "share", "pull")]
    value = pt.matrix()
    transform = ConditionalLaplace()
    log_jacobian = pytensor.function([value], transform.log_jac_det(value, *inputs), on_unused_input="ignore")
    coordinates = np.random.default_rng(2).normal(size=(MODES, PARTIES))
    columns = [
        (
            modes_from_coordinates(coordinates + _unit(*at, size=1e-4), **block)
            - modes_from_coordinates(coordinates - _unit(*at, size=1e-4), **block)
        ).ravel()
        / 2e-4
        for at in np.ndindex(MODES, PARTIES)
    ]
    _, expected = np.linalg.slogdet(np.stack(columns, axis=1))
    assert log_jacobian(coordinates) == pytest.approx(expected, abs=1e-5)


def test_the_pull_of_some_modes_puts_them_at_the_origin() -> None:
    block = _block(8)
    modes = np.random.default_rng(9).normal(size=(MODES, PARTIES)) * 0.1
    without_pull = {name: block[name] for name in ("scale", "information", "share")}
    pull = pull_towards(modes, **without_pull)
    np.testing.assert_allclose(
        coordinates_from_modes(modes, **without_pull, pull=pull), np.zeros((MODES, PARTIES)), atol=1e-8
    )


def _unit(mode: int, party: int, *, size: float = 1.0) -> np.ndarray:
    unit = np.zeros((MODES, PARTIES))
    unit[mode, party] = size
    return unit
