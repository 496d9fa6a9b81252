"""Opinion time of made-up elections: the ramp, jolts, and regions that vote before the others."""

from dataclasses import replace
from datetime import date, timedelta

import numpy as np
import pandas as pd
import pytest
from scipy.stats import chi2

from data_demo.made_up_country import Country, draw_country
from data_demo.made_up_election import SMALL_ELECTION, UNTIDY_ELECTION, simulate_election, simulate_scenery
from data_demo.made_up_scenery import MadeUpJolt, Scenery
from data_demo.made_up_size import draw_scenery
from data_demo.made_up_time import opinion_days

SHORT_ELECTION = replace(SMALL_ELECTION, parties=2, regions=6, seats=6, weeks=12, polled_weeks=10, polls=12)


def short_scenery() -> Scenery:
    return draw_scenery(SHORT_ELECTION, rng=np.random.default_rng(0))


def countries(scenery: Scenery, *, count: int) -> list[Country]:
    return [
        draw_country(scenery, shared_lean=False, rng=np.random.default_rng([7, seed]))
        for seed in range(count)
    ]


def national_step(country: Country, first: int, last: int) -> float:
    """Move of the log ratio of the first two parties, mean over regions, in units of a usual root day."""
    ratio = country.log_support[..., 0] - country.log_support[..., 1]
    moved = country.weights @ (ratio[last] - ratio[first])
    return float(moved / np.sqrt((country.sigma[:2] ** 2).sum() / 7))


def within_chi_square(squares: np.ndarray) -> bool:
    low, high = chi2.ppf([0.0005, 0.9995], squares.size)
    return bool(low < squares.sum() < high)


def test_without_ramp_and_jolts_a_day_is_a_day() -> None:
    days = pd.date_range("2030-01-01", "2030-06-02")
    passed = opinion_days(short_scenery(), days=days)
    assert passed[0] == 0
    assert (passed[1:] == 1).all()


def test_the_ramp_rises_from_sixty_days_before_polling_day_to_its_height_on_it() -> None:
    scenery = replace(short_scenery(), ramp_log_height=0.8)
    days = pd.date_range(scenery.polling_day - timedelta(days=100), scenery.polling_day)
    pace = opinion_days(scenery, days=days)[1:]
    np.testing.assert_allclose(pace[:40], 1)
    # Days are taken at noon: the last one is half a day short of the top.
    np.testing.assert_allclose(np.log(pace[-1]), 0.8 * (1 - 0.5 / 60))
    np.testing.assert_allclose(np.diff(np.log(pace[40:])), 0.8 / 60)


def test_opinion_moves_by_the_clock_the_truth_tells() -> None:
    """Variance of the move over the last sixty days: their opinion time, more than twice sixty days."""
    scenery = replace(short_scenery(), ramp_log_height=1.5)
    drawn = countries(scenery, count=400)
    passed = drawn[0].opinion_days[-60:].sum()
    assert passed > 130
    moves = np.array([national_step(c, -61, -1) for c in drawn])
    assert within_chi_square(moves**2 / passed)
    assert not within_chi_square(moves**2 / 60)


def test_a_jolt_moves_opinion_by_its_weeks_on_its_day_and_not_before() -> None:
    scenery = short_scenery()
    day = scenery.polling_day - timedelta(days=30)
    drawn = countries(replace(scenery, jolts=(MadeUpJolt(day, "A leader goes", weeks=4),)), count=400)
    jumps = np.array([national_step(c, -32, -31) for c in drawn])
    assert within_chi_square(jumps**2 / (1 + 28))
    before = np.array([national_step(c, -33, -32) for c in drawn])
    assert within_chi_square(before**2)


def test_regions_jump_beside_the_country_by_the_regional_ratio() -> None:
    scenery = short_scenery()
    day = scenery.polling_day - timedelta(days=30)
    drawn = countries(replace(scenery, jolts=(MadeUpJolt(day, "A leader goes", weeks=8),)), count=300)
    squares = []
    for country in drawn:
        ratio = country.log_support[..., 0] - country.log_support[..., 1]
        own = ratio - (ratio @ country.weights)[:, None]
        keeps = 1 - 2 * country.weights + (country.weights**2).sum()
        jump = (own[-31] - own[-32]) / np.sqrt(keeps * (country.sigma[:2] ** 2).sum() / 7 * (1 + 56))
        squares.append((jump**2).mean())
    assert np.mean(squares) == pytest.approx(0.25, rel=0.1)


def test_the_truth_tells_how_far_a_jolt_moved_each_party() -> None:
    election = simulate_scenery(
        replace(short_scenery(), jolts=(MadeUpJolt(date(2030, 4, 28), "A leader goes", weeks=30),)),
        seed=2,
    )
    jolts = election.truth.jolts
    assert jolts["moved"].sum() == pytest.approx(0, abs=1e-9)
    assert jolts["moved"].abs().max() > 0.3
    clock = election.truth.opinion_time.set_index("date")["pace"]
    assert clock["2030-04-28"] == pytest.approx(211)


def test_a_region_that_has_voted_moves_no_more_in_truth_in_polls_or_in_the_outcome() -> None:
    size = replace(UNTIDY_ELECTION, polls=60, seats=40)
    scenery = draw_scenery(size, rng=np.random.default_rng(0))
    early = scenery.regions[-1]
    assert early.polling_day is not None
    country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(1))
    voted = country.day_number(early.polling_day)
    moves = np.abs(np.diff(np.exp(country.log_support), axis=0))
    assert moves[voted:, -1].max() == 0
    assert moves[:voted, -1, 0].min() > 0
    assert moves[voted:, :-1, 0].min() > 0


def test_an_early_count_is_a_part_of_the_outcome_and_no_house_polls_a_region_that_has_voted() -> None:
    election = simulate_election(3, size=replace(UNTIDY_ELECTION, polls=400))
    early = election.scenery.regions[-1]
    counted = election.counted.set_index("seat")
    assert set(counted["region"]) == {early.code}
    assert len(counted) == len(early.seat_names)
    pd.testing.assert_frame_equal(counted, election.outcome.set_index("seat").loc[counted.index])
    there = election.polls[election.polls["region"] == early.code]
    assert len(there) > 5
    assert there["end"].max() < str(early.polling_day)
    assert election.polls["end"].max() > str(early.polling_day)
    regions = election.truth.regions.set_index("region")
    assert regions.loc[early.code, ["polling_day", "counted"]].tolist() == [
        str(early.polling_day),
        str(early.counted),
    ]
