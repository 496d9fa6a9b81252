"""Whitened errors: standard normal where the posterior is right, larger where it is too sure."""

from __future__ import annotations

import numpy as np
import pytest

from aggregator.studies.whitening import pool_errors, whitened_errors


def errors_of(rng: np.random.Generator, *, too_sure: float = 1.0) -> np.ndarray:
    centre, root = np.log([0.4, 0.35, 0.2, 0.05]), 0.1 * np.random.default_rng(0).normal(size=(4, 4))

    def shares(count: int, sd: float) -> np.ndarray:
        raised = np.exp(centre + sd * rng.normal(size=(count, 4)) @ root)
        return raised / raised.sum(axis=1, keepdims=True)

    return whitened_errors(shares(1500, 1 / too_sure), shares(1, 1.0)[0])


def test_whitened_errors_of_a_right_posterior_are_standard_normal() -> None:
    rng = np.random.default_rng(1)
    errors = np.concatenate([errors_of(rng) for _ in range(300)])
    assert errors.std() == pytest.approx(1, abs=0.08)
    assert errors.mean() == pytest.approx(0, abs=0.12)


def test_pooled_errors_leave_their_band_where_the_posterior_is_too_sure() -> None:
    rng = np.random.default_rng(2)
    right = pool_errors(errors_of(rng) for _ in range(40))
    sure = pool_errors(errors_of(rng, too_sure=1.5) for _ in range(40))
    assert right.degrees == 120 and right.inside
    assert not sure.inside and sure.chi_square > sure.band[1]
