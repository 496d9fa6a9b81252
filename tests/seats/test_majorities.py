"""Chances of being largest and of a majority, counted by hand and with their Monte Carlo error."""

from __future__ import annotations

import arviz as az
import numpy as np
import numpy.typing as npt
import pytest
import xarray as xr
from scipy.stats import beta

from aggregator.inputs.contest import Alliance, Contest, Counting
from aggregator.seats.counting import count_seats
from aggregator.seats.majorities import (
    Outcome,
    leads_in_draws,
    majorities_in_draws,
    majority_line,
    monte_carlo_error,
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


def chances(
    seats: xr.DataArray, *, alliances: tuple[Alliance, ...] = (), majority: npt.ArrayLike
) -> dict[tuple[str, str], float]:
    """Chance of every outcome by its name and code."""
    outcomes = leads_in_draws(seats, outcome=Outcome.LARGEST)
    outcomes += majorities_in_draws(seats, alliances=alliances, majority=majority)
    return {(outcome.value, code): float(happens.mean()) for outcome, code, happens in outcomes}


def test_chances_equal_a_count_by_hand() -> None:
    # Chamber of 10, majority 6: FER alone; the pact only together; LAN alone; nobody; tie for largest.
    seats = seats_of((6, 3, 1), (4, 4, 2), (2, 7, 1), (5, 3, 2), (5, 5, 0))
    found = chances(seats, alliances=(GLOW,), majority=6)
    assert found["majority_alone", "FER"] == pytest.approx(1 / 5)
    assert found["majority_alone", "LAN"] == pytest.approx(1 / 5)
    assert found["majority_only_as_alliance", "GLOW"] == pytest.approx(1 / 5)
    assert found["no_majority", ""] == pytest.approx(2 / 5)
    assert found["largest", "FER"] == pytest.approx((1 + 1 / 2 + 0 + 1 + 1 / 2) / 5)
    assert found["largest", "LAN"] == pytest.approx((0 + 1 / 2 + 1 + 0 + 1 / 2) / 5)


def test_outcomes_of_majority_are_complete_and_exclusive_in_every_draw() -> None:
    contest = made_up_contest()
    counted = count_seats(
        made_up_draws(draws=300),
        last_result=made_up_last_result(),
        contest=contest,
        rng=np.random.default_rng(1),
    )
    seats = counted["seats_polling_day"]
    majority = majority_line(contest, chamber=int(counted.attrs["chamber"]))
    held = majorities_in_draws(seats, alliances=contest.alliances, majority=majority)
    np.testing.assert_array_equal(sum(happens for *_, happens in held), 1)
    leads = leads_in_draws(seats, outcome=Outcome.LARGEST)
    np.testing.assert_allclose(sum(happens for *_, happens in leads), 1)


def test_others_neither_lead_nor_hold_a_majority() -> None:
    seats = seats_of((1, 2, 7), (6, 4, 0)).assign_coords(party=["FER", "LAN", "OTH"])
    found = chances(seats, majority=6)
    assert "OTH" not in {code for _, code in found}
    assert found["largest", "LAN"] == pytest.approx(1 / 2)
    assert found["no_majority", ""] == pytest.approx(1 / 2)


@pytest.mark.parametrize(("chamber", "line"), [(180, 91), (181, 91), (1, 1), (2, 2)])
def test_majority_is_the_smallest_whole_number_above_half(chamber: int, line: int) -> None:
    assert majority_line(made_up_contest(), chamber=chamber) == line


def test_contest_may_set_its_own_majority() -> None:
    contest: Contest = made_up_contest().model_copy(update={"counting": Counting(majority=120)})
    assert majority_line(contest, chamber=180) == 120


def test_a_chamber_that_grows_has_the_line_of_each_draw() -> None:
    # Regular chamber 10, in the second draw two overhang seats: 6 of 10 is a majority, 6 of 12 is not.
    seats = seats_of((6, 3, 1), (6, 4, 2), (4, 4, 2))
    line = majority_line(made_up_contest(), chamber=seats.sum("party"))
    assert line.tolist() == [[6, 7, 6]]
    found = chances(seats, alliances=(GLOW,), majority=line)
    assert found["majority_alone", "FER"] == pytest.approx(1 / 3)
    assert found["majority_only_as_alliance", "GLOW"] == pytest.approx(1 / 3)
    assert found["no_majority", ""] == pytest.approx(1 / 3)


def test_overhang_does_not_move_the_contests_own_majority() -> None:
    contest: Contest = made_up_contest().model_copy(update={"counting": Counting(majority=6)})
    assert majority_line(contest, chamber=np.array([[10, 12]])).tolist() == [[6, 6]]


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
    # Brown, Cai & DasGupta (2001): given no occurrence in S draws, Jeffreys' posterior is Beta(1/2, S + 1/2).
    assert monte_carlo_error(np.zeros((4, 1000))) == pytest.approx(beta(0.5, 4000.5).std())


def test_errors_of_many_chances_at_once_are_those_of_each_alone() -> None:
    happens = np.random.default_rng(3).random((2, 200, 3)) < [0.0, 0.3, 1.0]
    each = [monte_carlo_error(happens[..., place]) for place in range(3)]
    np.testing.assert_allclose(monte_carlo_error(happens), each)
