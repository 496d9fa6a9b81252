"""Local noise has the spread it says, and a region of one seat keeps its own."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from aggregator.seats.baseline import BaselinePriors, build_baseline
from aggregator.seats.local_noise import LocalPriors
from aggregator.seats.local_swing import draw_local_strength
from tests.made_up_draws import made_up_contest, made_up_last_result


def baseline_of(*, seats_per_region: int = 8, unseen_sd: float = 0.0) -> xr.Dataset:
    return build_baseline(
        made_up_last_result(seats_per_region=seats_per_region),
        contest=made_up_contest(),
        priors=BaselinePriors(unseen_sd=unseen_sd),
    )


def log_deviation(baseline: xr.Dataset, priors: LocalPriors, *, party: str, draws: int) -> np.ndarray:
    strength = draw_local_strength(
        baseline, draws=draws, rng=np.random.default_rng(5), priors=priors
    ).strength[:, baseline["party"].to_numpy().tolist().index(party)]
    return np.log(strength) - baseline["log_share"].sel(party=party).to_numpy()


def test_standard_deviation_of_the_heavy_tailed_noise_is_the_drawn_one() -> None:
    priors = LocalPriors(slope_sd=0.0, noise_sd_log_sd=0.0)
    noise = log_deviation(baseline_of(), priors, party="FER", draws=20_000)
    assert noise.std() == pytest.approx(priors.noise_sd_median, rel=0.02)


def test_noise_follows_student_t_not_the_normal_law() -> None:
    priors = LocalPriors(slope_sd=0.0, noise_sd_log_sd=0.0)
    noise = log_deviation(baseline_of(), priors, party="FER", draws=20_000)
    # Student t with 5 degrees of freedom, scaled to sd 1: 99.5 % point 4.0321 * sqrt(3/5) = 3.1233
    # (handbook tables of t); the normal law has 2.5758.
    assert np.quantile(noise, 0.995) / priors.noise_sd_median == pytest.approx(3.1233, rel=0.03)


def test_noise_sd_of_a_party_varies_between_draws_as_its_prior_says() -> None:
    priors = LocalPriors(slope_sd=0.0)
    noise = log_deviation(baseline_of(seats_per_region=200), priors, party="FER", draws=2000)
    log_sd = np.log(noise.std(axis=1))
    assert np.exp(np.median(log_sd)) == pytest.approx(priors.noise_sd_median, rel=0.06)
    assert log_sd.std() == pytest.approx(priors.noise_sd_log_sd, rel=0.06)


def test_slope_moves_strongholds_apart_and_leaves_the_middle() -> None:
    baseline = baseline_of()
    priors = LocalPriors(noise_sd_median=1e-9)
    deviation = log_deviation(baseline, priors, party="LAN", draws=5000)
    base = baseline["log_share"].sel(party="LAN")
    here = baseline["seat_region"] == "PORT"
    centred = (base - (base * baseline["weight"])[here].sum())[here].to_numpy()
    slope = deviation[:, here.to_numpy()] / centred
    np.testing.assert_allclose(slope.std(axis=0), priors.slope_sd, rtol=0.05)
    np.testing.assert_allclose(slope.min(axis=1), slope.max(axis=1), atol=1e-4)


def test_region_of_one_seat_keeps_that_seats_noise() -> None:
    baseline = baseline_of(seats_per_region=1)
    local = draw_local_strength(
        baseline, draws=50, rng=np.random.default_rng(2), priors=LocalPriors(slope_sd=0.0)
    )
    party = baseline["party"].to_numpy().tolist().index("FER")
    noise = np.log(local.strength[:, party]) - baseline["log_share"].sel(party="FER").to_numpy()
    np.testing.assert_allclose(local.region_deviation[:, :, party], noise, atol=1e-5)


def test_deviation_of_a_region_shrinks_with_the_root_of_its_seats() -> None:
    priors = LocalPriors(slope_sd=0.0, noise_sd_log_sd=0.0)
    sd = {}
    for seats in (4, 36):
        local = draw_local_strength(
            baseline_of(seats_per_region=seats), draws=4000, rng=np.random.default_rng(3), priors=priors
        )
        sd[seats] = local.region_deviation[:, 0, 0].std()
        assert sd[seats] == pytest.approx(priors.noise_sd_median / np.sqrt(seats), rel=0.15)
    assert sd[4] / sd[36] == pytest.approx(3, rel=0.15)


def test_party_without_last_votes_strays_more() -> None:
    priors = LocalPriors(slope_sd=0.0, noise_sd_log_sd=0.0)
    noise = log_deviation(baseline_of(unseen_sd=0.5), priors, party="TID", draws=5000)
    assert noise.std() == pytest.approx(np.hypot(0.5, priors.noise_sd_median), rel=0.03)
