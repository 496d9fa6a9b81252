"""What two results teach about how seats stray: the truth that was simulated comes back."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.seats.local_noise import LocalPriors, learn_local_noise, stray_between

PRIORS = LocalPriors()
PARTIES = ("FER", "HED", "LAN")


def two_results(
    seed: int,
    *,
    sd: tuple[float, ...],
    seats_per_region: int = 40,
    cluster_part: float = 0.0,
    regions: int = 4,
) -> tuple[xr.Dataset, pd.DataFrame]:
    """The last result as a baseline has it, and the one before; clusters of four seats."""
    rng = np.random.default_rng(seed)
    n = seats_per_region * regions
    region = np.repeat([f"R{i}" for i in range(regions)], seats_per_region)
    cluster = np.array([f"C{i // 4}" for i in range(n)])
    before = np.exp(rng.normal(np.log([0.45, 0.35, 0.2]), 0.4, (n, 3)))
    before /= before.sum(axis=1, keepdims=True)
    moved = np.log(before)
    moved += np.repeat(rng.normal(0, 0.2, (regions, 3)), seats_per_region, axis=0)
    moved += rng.normal(0, 0.1, 3) * (np.log(before) - np.log(before).mean(axis=0))
    own = rng.standard_t(5, (n, 3)) * np.sqrt(3 / 5)
    common = np.repeat(rng.normal(size=(n // 4, 3)), 4, axis=0)
    stray = np.sqrt(1 - cluster_part) * own + np.sqrt(cluster_part) * common
    # The model's noise is in log shares before they are made to sum to one; so is this.
    last = np.exp(moved + np.array(sd) * stray)
    last /= last.sum(axis=1, keepdims=True)
    seats = [f"S{i:03d}" for i in range(n)]
    baseline = xr.Dataset(
        {"last_share": (("seat", "party"), last)},
        coords={
            "seat": seats,
            "party": list(PARTIES),
            "seat_region": ("seat", region),
            "seat_cluster": ("seat", cluster),
        },
    )
    votes = pd.DataFrame(np.rint(before * 40_000), columns=list(PARTIES)).assign(seat=seats)
    return baseline, votes


def test_without_an_earlier_result_the_prior_holds() -> None:
    baseline, _ = two_results(1, sd=(0.1, 0.1, 0.1))
    noise = learn_local_noise(baseline, before_last=None, priors=PRIORS)
    np.testing.assert_allclose(np.exp(noise.log_sd), PRIORS.noise_sd_median)
    np.testing.assert_allclose(noise.log_sd_sd, PRIORS.noise_sd_log_sd)
    assert (noise.seats == 0).all()
    assert noise.cluster_part == PRIORS.cluster_part


@pytest.mark.parametrize("sd", [(0.2, 0.2, 0.2), (0.1, 0.2, 0.3)])
def test_noise_comes_back_within_its_stated_error(sd: tuple[float, float, float]) -> None:
    z = []
    for seed in range(20):
        baseline, before = two_results(seed, sd=sd)
        noise = learn_local_noise(baseline, before_last=before, priors=PRIORS)
        z.append((noise.log_sd - np.log(sd)) / noise.log_sd_sd)
        assert (noise.seats == 160).all()
    # The allowance for another election stands beside the error of this one, so z is small.
    assert np.abs(np.mean(z, axis=0)).max() < 1
    assert np.sqrt(np.mean(np.square(z), axis=0)).max() < 1.1


@pytest.mark.parametrize("part", [0.0, 0.5])
def test_part_that_neighbours_share_comes_back(part: float) -> None:
    found = []
    for seed in range(8):
        baseline, before = two_results(seed, sd=(0.2, 0.2, 0.2), cluster_part=part)
        found.append(learn_local_noise(baseline, before_last=before, priors=PRIORS).cluster_part)
    # Pulled to the prior's .3 by 50 pairs against 720.
    assert np.mean(found) == pytest.approx((50 * PRIORS.cluster_part + 720 * part) / 770, abs=0.06)


def test_seats_that_did_not_exist_before_are_left_out() -> None:
    baseline, before = two_results(3, sd=(0.2, 0.2, 0.2))
    stray = stray_between(baseline, before.iloc[20:])
    assert set(stray["seat"]) == set(baseline["seat"].to_numpy()[20:])


def test_too_few_seats_leave_the_prior() -> None:
    baseline, before = two_results(3, sd=(0.2, 0.2, 0.2))
    noise = learn_local_noise(baseline, before_last=before.iloc[:5], priors=PRIORS)
    np.testing.assert_allclose(np.exp(noise.log_sd), PRIORS.noise_sd_median)
    assert (noise.seats == 0).all()
