"""Chances of being largest and of a majority, counted by hand and with their Monte Carlo error."""

from __future__ import annotations

import arviz as az
import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.inputs.contest import Alliance, Contest, Counting
from aggregator.seats.counting import count_seats
from aggregator.seats.majorities import (
    chances_of_outcomes,
    majority_line,
    monte_carlo_error,
    summarise_majorities,
)
from tests.made_up_draws import made_up_contest, made_up_draws, made_up_last_result

GLOW = Alliance(code="GLOW", name="Glow Pact", members=("LAN", "HED"))


def seats_of(*draws: tuple[int, int, int]) -> xr.DataArray:
    """Seats of FER, LAN and HED in each draw of one chain."""
    return xr.DataArray(
        np.array([draws], dtype=np.int16),
        dims=("chain", "draw", "party"),
        coords={"party": ["FER", "LAN", "HED"]},
    )


def chance(table: pd.DataFrame, outcome: str, code: str = "") -> float:
    return table.set_index(["outcome", "code"]).loc[(outcome, code), "probability"]


def test_chances_equal_a_count_by_hand() -> None:
    # Chamber of 10, majority 6: FER alone; the pact only together; LAN alone; nobody; tie for largest.
    seats = seats_of((6, 3, 1), (4, 4, 2), (2, 7, 1), (5, 3, 2), (5, 5, 0))
    table = chances_of_outcomes(seats, alliances=[GLOW], majority=6)
    assert chance(table, "majority_alone", "FER") == pytest.approx(1 / 5)
    assert chance(table, "majority_alone", "LAN") == pytest.approx(1 / 5)
    assert chance(table, "majority_only_as_alliance", "GLOW") == pytest.approx(1 / 5)
    assert chance(table, "no_majority") == pytest.approx(2 / 5)
    assert chance(table, "largest", "FER") == pytest.approx((1 + 1 / 2 + 0 + 1 + 1 / 2) / 5)
    assert chance(table, "largest", "LAN") == pytest.approx((0 + 1 / 2 + 1 + 0 + 1 / 2) / 5)


def test_outcomes_of_majority_are_complete_and_exclusive() -> None:
    seats = count_seats(
        made_up_draws(draws=300),
        last_result=made_up_last_result(),
        contest=made_up_contest(),
        rng=np.random.default_rng(1),
    )
    table = summarise_majorities(seats, contest=made_up_contest())
    sums = table.assign(largest=table["outcome"] == "largest").groupby(["date", "kind", "largest"])
    np.testing.assert_allclose(sums["probability"].sum(), 1)
    assert table["kind"].value_counts()["on_polling_day"] == 2 * 4 + 2
    assert (table["mc_error"] > 0).all()


def test_others_neither_lead_nor_hold_a_majority() -> None:
    seats = seats_of((1, 2, 7), (6, 4, 0)).assign_coords(party=["FER", "LAN", "OTH"])
    table = chances_of_outcomes(seats, alliances=[], majority=6)
    assert "OTH" not in set(table["code"])
    assert chance(table, "largest", "LAN") == pytest.approx(1 / 2)
    assert chance(table, "no_majority") == pytest.approx(1 / 2)


def test_alliance_counts_only_on_the_days_it_exists() -> None:
    contest = made_up_contest()
    pact = contest.alliances[0].model_copy(update={"from_": pd.Timestamp("2033-02-20").date()})
    contest = contest.model_copy(update={"alliances": (pact,)})
    seats = count_seats(
        made_up_draws(draws=20, dates=4),
        last_result=made_up_last_result(),
        contest=contest,
        rng=np.random.default_rng(1),
    )
    table = summarise_majorities(seats, contest=contest)
    days = table.loc[table["code"] == "GLOW", "date"]
    assert days.min() == pd.Timestamp("2033-02-20")
    assert days.size == 4


@pytest.mark.parametrize(("chamber", "line"), [(180, 91), (181, 91), (1, 1), (2, 2)])
def test_majority_is_the_smallest_whole_number_above_half(chamber: int, line: int) -> None:
    assert majority_line(made_up_contest(), chamber=chamber) == line


def test_contest_may_set_its_own_majority() -> None:
    contest: Contest = made_up_contest().model_copy(update={"counting": Counting(majority=120)})
    assert majority_line(contest, chamber=180) == 120


def test_monte_carlo_error_of_independent_draws_is_the_binomial_one() -> None:
    happens = np.random.default_rng(1).random((4, 2500)) < 0.3
    assert monte_carlo_error(happens) == pytest.approx(np.sqrt(0.3 * 0.7 / 10_000), rel=0.1)


def test_monte_carlo_error_grows_with_autocorrelation() -> None:
    # A stationary first-order series with correlation .8: the sign of it has less information per draw.
    rng = np.random.default_rng(2)
    series = np.empty((4, 5000))
    series[:, 0] = rng.normal(size=4)
    for t in range(1, 5000):
        series[:, t] = 0.8 * series[:, t - 1] + 0.6 * rng.normal(size=4)
    happens = series > 0
    # Correlation of signs at lag k is (2/pi) asin(.8^k) (Sheppard's theorem on the bivariate normal).
    factor = 1 + 2 * sum(2 / np.pi * np.arcsin(0.8**k) for k in range(1, 200))
    expected = np.sqrt(0.25 * factor / happens.size)
    assert monte_carlo_error(happens) == pytest.approx(expected, rel=0.15)
    assert monte_carlo_error(happens) == pytest.approx(float(az.mcse(happens.astype(float))))


def test_outcome_that_never_happened_is_not_called_certain() -> None:
    assert monte_carlo_error(np.zeros((4, 1000))) == pytest.approx(1 / 4002)
