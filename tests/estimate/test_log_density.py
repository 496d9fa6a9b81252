"""The compiled log density is the model's, and its gradient too."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest

from aggregator.estimate.log_density import compile_log_density
from models.block_geometry import build_geometry
from models.election_model import build_election_model
from models.priors import Priors
from tests.models.made_up_arrays import made_up_arrays


def test_compiled_gradient_agrees_with_the_librarys_plain_evaluation() -> None:
    # Compile passes that write in place are where a compiled gradient has come out wrong unnoticed.
    arrays, _ = made_up_arrays(polls=30, weeks=16, free=1, absent=True, messy=True)
    rows = arrays.rows
    row, cell = np.nonzero((rows.used > 0) & (rows.answers < np.quantile(rows.answers[rows.used > 0], 0.1)))
    count = rows.answers[row, cell]
    intervals = {"small_row": row, "small_cell": cell, "small_low": 0.8 * count, "small_high": 1.2 * count}
    arrays = replace(arrays, rows=replace(rows, **intervals))
    model = build_election_model(arrays, geometry=build_geometry(arrays, priors=Priors()), priors=Priors())
    density = compile_log_density(model)
    plain_density = model.logp()
    plain = pytensor.function(
        model.value_vars,
        [plain_density, *pt.grad(plain_density, model.value_vars)],
        mode="FAST_COMPILE",
    )
    layout, rng = density.layout, np.random.default_rng(1)
    for _ in range(3):
        point = density.start + 0.3 * rng.normal(size=layout.size)
        value, gradient = density(point)
        expected, *parts = plain(*[layout.part(point, name) for name in layout.names])
        assert value == pytest.approx(float(expected), rel=1e-12)
        np.testing.assert_allclose(gradient, np.concatenate(parts, axis=None), rtol=1e-8, atol=1e-8)
