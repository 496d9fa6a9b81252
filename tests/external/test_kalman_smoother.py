"""The national walk against the exact Kalman smoother of a general-purpose library.

Source of the check: ``statsmodels`` ``UnobservedComponents`` (local level), an implementation of Durbin &
Koopman (2012), *Time Series Analysis by State Space Methods*. With two parties, one house, one region, no
shared lean, scales held fixed and large samples, the log-ratio of the two parties is a Gaussian random walk
seen with a known error, which the smoother solves exactly.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import date, timedelta

import numpy as np
import pytest
from statsmodels.tsa.statespace.structural import UnobservedComponents
from threadpoolctl import threadpool_limits

from aggregator.estimate.compiled_election import compile_election
from aggregator.estimate.knots import build_knots, knot_weights
from aggregator.estimate.sampling import ChainPlan
from models.arrays import CountryArrays, ElectionArrays, RowArrays
from models.priors import Priors
from tests.models.made_up_arrays import plain_leans

WEEKS = 26
WEEKS_BEFORE_FIRST_POLL = 10
RESPONDENTS = 20_000.0
KAPPA = 1.4
POLLING_DAY = date(2026, 5, 17)
FIXED = 1e-6


@pytest.fixture(scope="module")
def two_party_race() -> ElectionArrays:
    """Two parties near 50 %, polled by one house on most Sundays of half a year."""
    rng = np.random.default_rng(3)
    knots = build_knots(
        last_result=POLLING_DAY - timedelta(weeks=WEEKS + WEEKS_BEFORE_FIRST_POLL),
        first_fieldwork=POLLING_DAY - timedelta(weeks=WEEKS),
        middle_fieldwork=POLLING_DAY - timedelta(weeks=WEEKS // 2),
        polling_day=POLLING_DAY,
        ramp=False,
    )
    sd = 0.035 * np.sqrt(2 * 0.15 / 0.5)
    log_ratio = np.cumsum(sd * np.sqrt(knots.national_step) * rng.normal(size=len(knots.national_step)))
    asked = np.flatnonzero(rng.random(len(log_ratio) - 4) < 0.7)
    share = 1 / (1 + np.exp(-log_ratio[asked]))
    error_sd = np.sqrt(KAPPA / RESPONDENTS * share * (1 - share))
    share = share + error_sd * rng.normal(size=len(share))
    day = knots.national_day[asked + 1]
    rows = len(day)
    half = np.array([0.5, 0.5])
    return ElectionArrays(
        country=CountryArrays(
            parties=("HU", "UP"),
            regions=("ALL",),
            turnout=np.ones(1),
            standing=np.ones((1, 2), dtype=bool),
            start_log_share=np.log(half)[None],
            reference_share=half,
            lean_size=np.zeros(2),
            pilot_share=half,
            free_party=np.empty(0, dtype=np.int64),
        ),
        knots=knots,
        rows=RowArrays(
            polls=tuple(f"poll {i}" for i in range(rows)),
            houses=("Tarvick",),
            poll_of_row=np.arange(rows),
            house_of_row=np.zeros(rows, dtype=np.int64),
            row_of_part=np.arange(rows),
            national_weight=knot_weights(knots.national_day, first_day=day, last_day=day),
            region_weight=knot_weights(knots.region_day, first_day=day, last_day=day),
            region_mix=np.ones((rows, 1)),
            respondents=np.full(rows, RESPONDENTS),
            poll_respondents=np.full(rows, RESPONDENTS),
            weighting_known=np.zeros(rows),
            partition=np.broadcast_to(np.eye(2), (rows, 2, 2)).copy(),
            answers=np.stack([share, 1 - share], axis=1) * RESPONDENTS,
            used=np.ones((rows, 2)),
            small_row=np.empty(0, dtype=np.int64),
            small_cell=np.empty(0, dtype=np.int64),
            small_low=np.empty(0),
            small_high=np.empty(0),
        ),
        leans=plain_leans(np.zeros(rows, dtype=np.int64), houses=1, parties=2),
    )


def test_the_path_of_support_is_the_kalman_smoothers(two_party_race: ElectionArrays) -> None:
    """Means and sds of the log-ratio at every knot, within 3.5 Monte Carlo errors plus 1 % of an sd.

    The 1 % is for the answers' likelihood, which is Dirichlet-multinomial and normal only to first order.
    """
    priors = replace(
        Priors(),
        drift_log_sd=FIXED,
        party_spread=FIXED,
        weighting_loss_log_median=np.log(KAPPA - 1),
        weighting_loss_log_sd=FIXED,
        weighting_loss_spread=FIXED,
        error_floor_log_median=np.log(1e-9),
        error_floor_log_sd=FIXED,
        error_floor_spread=FIXED,
    )
    with threadpool_limits(1):
        election = compile_election(two_party_race, priors=priors, shared_lean=False)
        parameters, _ = election.sample(
            ChainPlan(chains=2, tune=300, draws=2000, seed=7), progress=lambda _: None
        )
    ours = (parameters.walk[:, :, 0] - parameters.walk[:, :, 1])[:, 1:]

    mean, sd = _kalman_smoother(two_party_race)
    draws = len(ours)
    # Draws of these near-normal coordinates are at least as good as half as many independent ones.
    monte_carlo = sd / np.sqrt(draws / 2)
    np.testing.assert_array_less(np.abs(ours.mean(axis=0) - mean), 3.5 * monte_carlo + 0.01 * sd)
    np.testing.assert_allclose(ours.std(axis=0), sd, rtol=0.01 + 3.5 / np.sqrt(draws))


def _kalman_smoother(arrays: ElectionArrays) -> tuple[np.ndarray, np.ndarray]:
    """Smoothed mean and sd of the log-ratio at every knot but the first, which is fixed at zero."""
    knots, rows = arrays.knots, arrays.rows
    observed = np.full(len(knots.national_step), np.nan)
    observed[rows.national_weight.argmax(axis=1) - 1] = np.log(rows.answers[:, 0] / rows.answers[:, 1])
    drift_variance = 2 * 0.035**2 * 0.15 / 0.5
    error_variance = KAPPA / RESPONDENTS / 0.25
    model = UnobservedComponents(observed, level="llevel")
    # The first state lies one long step after the last result.
    model.ssm.initialize_known(np.zeros(1), np.array([[drift_variance * knots.national_step[0]]]))
    smoothed = model.smooth([error_variance, drift_variance])
    return smoothed.smoothed_state[0], np.sqrt(smoothed.smoothed_state_cov[0, 0])
