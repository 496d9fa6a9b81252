"""Seats of a real election from the one before: 1987 as the last result, 1992 as the outcome.

National support is given, not polled, so only the step from support to seats is on trial, with the priors
every contest starts from. Data: pscl/UKHouseOfCommons, see `tests.external.uk_seats`.
"""

from __future__ import annotations

from datetime import date

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.seats.counting import count_seats
from tests.external.uk_seats import CODES, read_uk_seats

DRAWS = 4000
REGION = "ENG"
LAST, OUTCOME = read_uk_seats()
POLLING_DAY = date(1992, 4, 9)
WON_1987, WON_1992 = (357, 154, 10), (317, 194, 10)


def shares(result: pd.DataFrame) -> np.ndarray:
    votes = result[CODES].to_numpy()
    return votes / votes.sum(axis=1, keepdims=True)


def winners(share: np.ndarray) -> np.ndarray:
    """One where the party leads, dims (seat, party)."""
    return np.eye(len(CODES))[share.argmax(axis=1)]


def brier(chance: np.ndarray) -> np.ndarray:
    """Brier score of each seat's chances over all parties; lower is better."""
    return ((chance - winners(shares(OUTCOME))) ** 2).sum(axis=1)


@pytest.fixture(scope="module")
def seats() -> xr.Dataset:
    contest = Contest.model_validate(
        {
            "title": "House of Commons 1992, English seats",
            "polling_day": POLLING_DAY,
            "party": [{"code": code, "name": code} for code in CODES],
            "region": [{"code": REGION, "name": "England"}],
            "others": False,
        }
    )
    support = np.broadcast_to(
        shares(OUTCOME).mean(axis=0).astype(np.float32), (4, DRAWS // 4, 1, 1, len(CODES))
    )
    draws = xr.Dataset(
        {
            "support": (("chain", "draw", "date", "region", "party"), support),
            "support_polling_day": (("chain", "draw", "region", "party"), support[:, :, 0]),
        },
        coords={
            "chain": np.arange(4),
            "draw": np.arange(DRAWS // 4),
            "date": pd.to_datetime(["1992-04-08"]),
            "region": [REGION],
            "party": CODES,
        },
    )
    return count_seats(draws, last_result=LAST, contest=contest, rng=np.random.default_rng(1992))


def uniform_swing_chances(*, sd: np.ndarray) -> np.ndarray:
    """Chances (seat, party) under uniform swing with independent normal residuals."""
    last, outcome = shares(LAST), shares(OUTCOME)
    expected = last + outcome.mean(axis=0) - last.mean(axis=0)
    rng = np.random.default_rng(7)
    return sum(winners(expected + sd * rng.normal(size=expected.shape)) for _ in range(DRAWS)) / DRAWS


def test_the_data_are_those_of_the_published_count() -> None:
    assert tuple(winners(shares(LAST)).sum(axis=0)) == WON_1987
    assert tuple(winners(shares(OUTCOME)).sum(axis=0)) == WON_1992


def test_ninety_percent_intervals_of_seats_hold_all_three_parties(seats: xr.Dataset) -> None:
    low, high = seats["seats_polling_day"].quantile([0.05, 0.95], ("chain", "draw")).to_numpy()
    assert (low <= WON_1992).all()
    assert (high >= WON_1992).all()


def test_summed_chances_come_nearer_to_the_third_partys_seats_than_counted_leaders(
    seats: xr.Dataset,
) -> None:
    # Curtice and Firth (2008), JRSS A 171, 509-539: expected seats are the sum of winning probabilities.
    summed = seats["seat_chance"].sum("seat").sel(party="P3").item()
    led = winners(seats["seat_share"].transpose("seat", "party").to_numpy()).sum(axis=0)[2]
    assert abs(summed - 10) < abs(led - 10)


def test_seat_chances_score_far_better_than_counted_leaders(seats: xr.Dataset) -> None:
    leaders = winners(seats["seat_share"].transpose("seat", "party").to_numpy())
    assert brier(seats["seat_chance"].to_numpy()).mean() < 0.8 * brier(leaders).mean()


def test_seat_chances_score_no_worse_than_uniform_swing_with_known_residuals(seats: xr.Dataset) -> None:
    # The rival is told the residual sds of this very election (2.6, 3.7, 4.5 points), which nobody knows
    # beforehand. Neighbouring seats stray together, so the error of the difference is taken over counties.
    gap = brier(seats["seat_chance"].to_numpy()) - brier(
        uniform_swing_chances(sd=np.array([0.026, 0.037, 0.045]))
    )
    counties = read_uk_seats(by_county=True)[0]["region"]
    county = pd.Series(gap - gap.mean(), index=seats["seat"].to_numpy()).groupby(counties.to_numpy()).sum()
    error = np.sqrt((county**2).sum()) / gap.size
    assert gap.mean() < error


def test_seat_chances_are_calibrated(seats: xr.Dataset) -> None:
    # In each band of chances the party won about as often as stated: within three binomial errors.
    chance = seats["seat_chance"].to_numpy().ravel()
    won = winners(shares(OUTCOME)).ravel()
    for low, high in [(0.02, 0.1), (0.1, 0.3), (0.3, 0.7), (0.7, 0.9), (0.9, 0.98)]:
        band = (chance >= low) & (chance < high)
        expected = chance[band].mean()
        error = np.sqrt(expected * (1 - expected) / band.sum())
        assert abs(won[band].mean() - expected) < 3 * error, (low, high, won[band].mean(), expected)
