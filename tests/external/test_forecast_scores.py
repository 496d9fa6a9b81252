"""Scores of forecasts against published values and a general-purpose library.

Sources: the CRPS of a normal distribution in closed form, Gneiting & Raftery 2007, JASA 102:359–378, equation
(5), with the values worked out from it; the library ``scoringrules`` (Zanetta & Allen) for ensembles.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import scoringrules
from scipy.stats import norm

from aggregator.replays.distribution_scores import score_crps, score_log
from aggregator.replays.seat_scores import LISTED, score_seats

# A normal distribution as an ensemble of its own quantiles: the only error left is that of the steps.
QUANTILES = norm.ppf((np.arange(40_000) + 0.5) / 40_000)


@pytest.mark.parametrize(
    ("mean", "sd", "truth", "published"),
    [(0, 1, 0, 0.2336949773), (0, 1, 1, 0.6024413576), (50, 3, 53, 1.8073240729)],
)
def test_crps_of_a_normal_distribution_is_the_published_one(mean, sd, truth, published):
    draws = (mean + sd * QUANTILES)[:, None]
    assert score_crps(draws, np.array([float(truth)]))[0] == pytest.approx(published, rel=2e-5)


def test_mean_crps_of_a_right_normal_forecast_is_its_sd_over_root_pi():
    sd = 3.0
    truth = sd * norm.ppf((np.arange(400) + 0.5) / 400)
    draws = np.repeat(sd * norm.ppf((np.arange(2_000) + 0.5) / 2_000)[:, None], 400, axis=1)
    assert score_crps(draws, truth).mean() == pytest.approx(sd / np.sqrt(np.pi), rel=2e-3)


def test_crps_and_log_score_are_those_of_scoringrules_on_random_draws():
    rng = np.random.default_rng(3)
    draws = rng.normal(rng.normal(size=60), rng.uniform(0.2, 5, 60), (300, 60))
    truth = rng.normal(size=60)
    assert score_crps(draws, truth) == pytest.approx(scoringrules.crps_ensemble(truth, draws.T), rel=1e-12)
    assert score_log(draws, truth) == pytest.approx(scoringrules.logs_ensemble(truth, draws.T), rel=1e-9)


def test_crps_of_whole_seats_is_that_of_scoringrules():
    rng = np.random.default_rng(4)
    draws, truth = rng.poisson(6, (300, 40)).astype(float), rng.poisson(6, 40).astype(float)
    assert score_crps(draws, truth) == pytest.approx(scoringrules.crps_ensemble(truth, draws.T), rel=1e-12)


def test_brier_score_of_two_parties_is_twice_that_of_scoringrules():
    """Brier's original score sums over the outcomes; with two outcomes both terms are the same."""
    rng = np.random.default_rng(5)
    chance = rng.uniform(size=50)
    won = rng.integers(0, 2, 50).astype(float)
    rows = [
        ["c", pd.Timestamp("2033-01-02"), 7, "fieldfold", f"S{seat}", code, given, came, 1000.0]
        for seat in range(50)
        for code, given, came in (("FER", chance[seat], won[seat]), ("LAN", 1 - chance[seat], 1 - won[seat]))
    ]
    table = score_seats(pd.DataFrame(rows, columns=LISTED))
    expected = 2 * np.mean(scoringrules.brier_score(won, chance))
    assert table["brier"].tolist() == pytest.approx([expected])
