"""Ageing and sampling against published figures and exact distributions."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from scipy.stats import hypergeom

from aggregator.shelf_life.sample_majority import chance_sample_names_leader
from aggregator.shelf_life.worth import summarise_half_life, summarise_shelf_life

# Random walk fitted by exact Gaussian maximum likelihood to the open register
# pscl/AustralianElectionPolling (Labor share, both official results as anchors, extra poll variance):
# 0.336 points per root of a day. Method: Jackman, S. (2005), Pooling the polls over an election campaign,
# Australian Journal of Political Science 40, 499-517.
AUSTRALIAN_DRIFT = 0.00336
LABOR_SHARE = 0.44


def australian_draws() -> xr.Dataset:
    """Two blocs and one perfect house, with the drift of the Australian register."""
    weekly_sd = AUSTRALIAN_DRIFT * np.sqrt(7)
    # Two log-ratios that move on their own move the share by sqrt(2) p (1 - p) sd.
    sd_log = weekly_sd / (np.sqrt(2) * LABOR_SHARE * (1 - LABOR_SHARE))
    per_draw, party = ("chain", "draw"), ["LAB", "REST"]
    share = np.array([LABOR_SHARE, 1 - LABOR_SHARE])
    # Opinion time runs evenly, a week a week.
    days = pd.date_range("2007-07-26", "2007-11-24")
    clock = np.broadcast_to(np.arange(len(days)) / 7, (1, 4, len(days)))
    return xr.Dataset(
        {
            "national_support": ((*per_draw, "date", "party"), np.broadcast_to(share, (1, 4, 1, 2))),
            "kappa": ((*per_draw, "house"), np.ones((1, 4, 1))),
            "rho": ((*per_draw, "house"), np.zeros((1, 4, 1))),
            "drift_sd_log": ((*per_draw, "party"), np.full((1, 4, 2), sd_log)),
            "house_sd_log": ((*per_draw, "party"), np.zeros((1, 4, 2))),
            "shared_lean_sd_log": (("party",), np.zeros(2)),
            "opinion_clock": ((*per_draw, "day"), clock),
        },
        coords={"party": party, "house": ["one"], "date": pd.to_datetime(["2007-10-24"]), "day": days},
        attrs={"run_date": "2007-10-24", "polling_day": "2007-11-24"},
    )


def test_half_life_of_a_poll_in_the_australian_campaign() -> None:
    # By hand: sampling variance .44 * .56 / 1000 = 2.464e-4; drift .00336^2 = 1.12896e-5 per day;
    # they are equal after 2.464e-4 / 1.12896e-5 = 21.825 days.
    half = summarise_half_life(australian_draws(), sample=1000).set_index("code")
    assert half.loc["LAB", "half_life_days"] == pytest.approx(21.825, abs=0.001)
    assert half.loc["REST", "half_life_days"] == pytest.approx(21.825, abs=0.001)


def test_expected_error_a_month_before_the_australian_election() -> None:
    # By hand: sampling sqrt(2.464e-4) = 1.570 points, drift .336 * sqrt(31) = 1.871 points.
    fresh = summarise_shelf_life(australian_draws(), sample=1000, ages=(0,)).set_index("code").loc["LAB"]
    assert fresh["error_sampling"] == pytest.approx(1.570, abs=0.001)
    assert fresh["error_drift"] == pytest.approx(1.871, abs=0.001)
    assert fresh["expected_error"] == pytest.approx(np.hypot(1.570, 1.871), abs=0.001)


@pytest.mark.parametrize("share_and_error", [(0.5, 1.581), (0.3, 1.449), (0.1, 0.949)])
def test_sampling_error_of_a_perfect_house_is_the_textbook_one(
    share_and_error: tuple[float, float],
) -> None:
    # Simple random sampling, n = 1000: s.e. sqrt(p (1 - p) / n) = 1.581 points at 50 % (common practice).
    share, error = share_and_error
    draws = australian_draws()
    draws["national_support"] = xr.zeros_like(draws["national_support"]) + xr.DataArray(
        [share, 1 - share], dims="party"
    )
    fresh = summarise_shelf_life(draws, sample=1000, ages=(0,)).set_index("code")
    assert fresh.loc["LAB", "error_sampling"] == pytest.approx(error, abs=0.001)


def test_chance_that_a_sample_names_the_leader_is_the_exact_binomial_one() -> None:
    # Rule of practice: a random sample's majority is the electorate's majority (common practice; the values
    # are exact binomial sums).
    assert chance_sample_names_leader(1001, share=0.52) == pytest.approx(0.897309, abs=1e-6)
    assert chance_sample_names_leader(751, share=0.55) > 0.99
    assert chance_sample_names_leader(1001, share=0.54) > 0.99
    assert chance_sample_names_leader(2501, share=0.52) > 0.975
    assert chance_sample_names_leader(4001, share=0.52) > 0.99


@pytest.mark.parametrize("electorate", [50_000, 5_000_000])
def test_size_of_the_electorate_hardly_matters_to_a_sample(electorate: int) -> None:
    voters_for_leader = round(0.52 * electorate)
    exact = hypergeom.sf(500, electorate, voters_for_leader, 1001)
    assert chance_sample_names_leader(1001, share=0.52) == pytest.approx(exact, abs=0.003)


def test_even_sample_that_splits_counts_half() -> None:
    # Two respondents: both for the leader .36, one each .48.
    assert chance_sample_names_leader(2, share=0.6) == pytest.approx(0.36 + 0.24)


def test_share_that_does_not_lead_is_refused() -> None:
    with pytest.raises(ValueError, match=r"share is 0\.5; expected the leader's share"):
        chance_sample_names_leader(1000, share=0.5)
