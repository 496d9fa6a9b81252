"""The formula for an ageing poll, against simulation and exact Bayes."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st

from aggregator.shelf_life.ageing import fresh_worth, half_life_weeks, share_variance

N, SHARE, KAPPA, WEEKLY_VARIANCE = 900, 0.4, 1.5, 0.005**2
WEEKS = 6


def sampling_variance(respondents: float) -> float:
    return SHARE * (1 - SHARE) * KAPPA / respondents


def simulated_polls(rng: np.random.Generator, paths: int) -> tuple[np.ndarray, np.ndarray]:
    """Support now along many random walks, and a poll taken some weeks ago on each."""
    steps = rng.normal(0, np.sqrt(WEEKLY_VARIANCE), (paths, WEEKS))
    path = SHARE + np.concatenate([np.zeros((paths, 1)), steps.cumsum(axis=1)], axis=1)
    return path[:, -1], path[:, 0] + rng.normal(0, np.sqrt(sampling_variance(N)), paths)


def worth() -> float:
    return fresh_worth(N, weeks=WEEKS, share=SHARE, drift_variance=WEEKLY_VARIANCE, kappa=KAPPA)


def test_old_poll_misses_todays_support_as_a_fresh_poll_of_its_worth_would() -> None:
    today, answer = simulated_polls(np.random.default_rng(1), 400_000)
    assert (answer - today).var() == pytest.approx(sampling_variance(worth()), rel=0.01)


def test_best_mix_of_old_and_fresh_poll_weighs_the_old_one_by_its_worth() -> None:
    rng = np.random.default_rng(2)
    fresh_size = 500
    today, old = simulated_polls(rng, 400_000)
    fresh = today + rng.normal(0, np.sqrt(sampling_variance(fresh_size)), today.size)
    # The exact Bayes estimate is linear: its weight on the old poll is found by regression on many paths
    # of (today - fresh) on (old - fresh).
    gap = old - fresh
    weight = (gap * (today - fresh)).sum() / (gap**2).sum()
    assert weight == pytest.approx(worth() / (worth() + fresh_size), rel=0.02)
    error = (today - (fresh + weight * gap)).var()
    assert error == pytest.approx(sampling_variance(worth() + fresh_size), rel=0.01)


def test_poll_at_its_half_life_is_worth_half_its_respondents() -> None:
    age = half_life_weeks(N, share=SHARE, drift_variance=WEEKLY_VARIANCE, kappa=KAPPA)
    half = fresh_worth(N, weeks=age, share=SHARE, drift_variance=WEEKLY_VARIANCE, kappa=KAPPA)
    assert half == pytest.approx(N / 2)


@given(
    sample=st.floats(50, 20_000),
    weeks=st.floats(0, 200),
    later=st.floats(0.01, 50),
    share=st.floats(0.01, 0.99),
    kappa=st.floats(1, 4),
)
def test_worth_only_falls_with_age_and_never_exceeds_the_sample(
    sample: float, weeks: float, later: float, share: float, kappa: float
) -> None:
    first = fresh_worth(sample, weeks=weeks, share=share, drift_variance=WEEKLY_VARIANCE, kappa=kappa)
    second = fresh_worth(
        sample, weeks=weeks + later, share=share, drift_variance=WEEKLY_VARIANCE, kappa=kappa
    )
    assert 0 < second < first <= sample * (1 + 1e-12)


def test_variance_of_a_summed_share_equals_that_of_simulated_small_moves() -> None:
    parties = ["FER", "LAN", "HED", "OTH"]
    share = xr.DataArray([0.4, 0.3, 0.2, 0.1], coords={"party": parties})
    sd_log = xr.DataArray([0.02, 0.05, 0.01, 0.08], coords={"party": parties})
    rng = np.random.default_rng(3)
    moved = share.to_numpy() * np.exp(rng.normal(size=(400_000, 4)) * sd_log.to_numpy() * 0.1)
    moved /= moved.sum(axis=1, keepdims=True)
    for members in (["FER"], ["OTH"], ["LAN", "HED"], ["FER", "LAN", "HED"]):
        together = moved[:, [parties.index(m) for m in members]].sum(axis=1)
        ours = share_variance(share, sd_log=sd_log, members=members).item()
        assert together.var() / 0.1**2 == pytest.approx(ours, rel=0.01)


@pytest.mark.parametrize("members", [["FER"], ["LAN", "OTH"], ["FER", "LAN", "HED"]])
def test_lean_with_sd_over_root_share_is_binomial_in_shape_for_every_sum(members: list[str]) -> None:
    share = xr.DataArray([0.4, 0.3, 0.2, 0.1], coords={"party": ["FER", "LAN", "HED", "OTH"]})
    together = share.sel(party=members).sum().item()
    ours = share_variance(share, sd_log=0.05 / np.sqrt(share), members=members).item()
    assert ours == pytest.approx(0.05**2 * together * (1 - together))


def test_all_parties_together_never_move() -> None:
    share = xr.DataArray([0.5, 0.3, 0.2], coords={"party": ["FER", "LAN", "OTH"]})
    everyone = share_variance(share, sd_log=share * 0 + 0.1, members=["FER", "LAN", "OTH"])
    assert everyone.item() == pytest.approx(0, abs=1e-18)
