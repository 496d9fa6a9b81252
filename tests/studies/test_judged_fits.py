"""One fit against the truth: hand values, the libraries' scores, and which numbers are judged at all."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
import scoringrules
from scipy.stats import kstest, percentileofscore

from aggregator.replays.distribution_scores import INTERVALS
from aggregator.studies.invented_elections import (
    HABITS_STREAM,
    InventedElection,
    Quantity,
    draw_habits,
    draw_invented_election,
)
from aggregator.studies.judged_fits import (
    JUDGED_COLUMNS,
    draws_of,
    judge_fit,
    judge_whole_country,
    list_chances,
)
from data_demo.made_up_election import SMALL_ELECTION, UNTIDY_ELECTION, simulate_election
from tests.studies.made_up_fits import PARTIES, REGIONS, MadeUpFit, made_up_pair

TINY = replace(SMALL_ELECTION, parties=3, regions=2, seats=6, polls=25, weeks=26, polled_weeks=24, houses=4)
SMALL_UNTIDY = replace(UNTIDY_ELECTION, parties=6, regions=4, seats=12, polls=50, weeks=40, polled_weeks=38)

# An election whose polls fall silent seven days before polling day, after the count of its first phase.
COUNTED_SEED = 1


@pytest.fixture(scope="module")
def tiny() -> InventedElection:
    return draw_invented_election(4, size=TINY)


@pytest.fixture
def pair(tiny: InventedElection) -> tuple[InventedElection, MadeUpFit]:
    return made_up_pair(3, inputs=tiny.inputs)


def test_every_number_is_judged_once_and_scores_are_the_librarys(
    pair: tuple[InventedElection, MadeUpFit],
) -> None:
    election, fit = pair
    judged = judge_fit(election, fit, rng=np.random.default_rng(0))
    assert list(judged.columns) == list(JUDGED_COLUMNS)
    # Three parties: the country and two regions on polling day, the country today, seats.
    assert len(judged) == 3 * 5
    row = judged[judged["quantity"].eq(Quantity.SUPPORT_POLLING_DAY) & judged["region"].eq("R2")].iloc[1]
    draws = 100 * fit.data["support_polling_day"].sel(region="R2", party="P2").to_numpy()
    assert row["estimate"] == pytest.approx(draws.mean())
    assert row["crps"] == pytest.approx(scoringrules.crps_ensemble(row["truth"], draws, estimator="nrg"))
    for percent in INTERVALS:
        low, high = np.percentile(draws, [50 - percent / 2, 50 + percent / 2])
        assert row[f"inside_{percent}"] == (low <= row["truth"] <= high)
        assert row[f"width_{percent}"] == pytest.approx(high - low)
    assert row["place"] == pytest.approx(percentileofscore(draws, row["truth"]) / 100, abs=2 / len(draws))


def test_places_of_seats_are_spread_over_their_own_step(tiny: InventedElection) -> None:
    """Truth and draws from one distribution with three seats: places are uniform though seats are whole."""
    places = []
    for seed in range(100):
        election, fit = made_up_pair(seed, inputs=tiny.inputs)
        judged = judge_fit(election, fit, rng=np.random.default_rng([seed, 1]))
        seats = judged[judged["quantity"] == Quantity.SEATS]
        places.append(seats["place"].iloc[0])
    assert kstest(places, "uniform").pvalue > 0.01


def test_whitened_errors_of_a_fit_are_those_of_its_national_shares(
    pair: tuple[InventedElection, MadeUpFit],
) -> None:
    election, fit = pair
    errors = judge_whole_country(election, fit)
    assert errors.shape == (len(PARTIES) - 1,)
    # By another way: the Mahalanobis distance of two log-ratios.
    draws = np.log(fit.data["national_support_polling_day"].to_numpy())
    ratios = draws[:, :2] - draws[:, 2:]
    truth = election.truth.query("quantity == 'support_polling_day' and region == ''")["truth"].to_numpy()
    gap = np.log(truth[:2] / truth[2]) - ratios.mean(axis=0)
    distance = gap @ np.linalg.solve(np.cov(ratios.T), gap)
    assert (errors**2).sum() == pytest.approx(distance)


def test_chances_say_who_won(pair: tuple[InventedElection, MadeUpFit]) -> None:
    election, fit = pair
    chances = list_chances(election, fit)
    won = chances[chances["won"] == 1].set_index("seat")["code"]
    assert won.to_dict() == election.winners.to_dict()
    assert chances.groupby("seat")["chance"].sum().tolist() == pytest.approx([1.0, 1.0, 1.0])


def test_a_contest_without_seats_is_judged_by_support_alone(
    pair: tuple[InventedElection, MadeUpFit],
) -> None:
    election, fit = pair
    bare = replace(fit, data=fit.data.drop_vars(["seats_polling_day", "seat_chance"]))
    judged = judge_fit(election, bare, rng=np.random.default_rng(0))
    assert Quantity.SEATS not in set(judged["quantity"])
    assert list_chances(election, bare).empty


def test_regions_and_codes_never_change_places(pair: tuple[InventedElection, MadeUpFit]) -> None:
    _, fit = pair
    turned = replace(fit, data=fit.data.isel(region=[1, 0], party=[2, 0, 1]))
    columns = [("R1", "P1"), ("R2", "OTH"), ("", "P2")]
    pd.testing.assert_frame_equal(
        draws_of(fit, Quantity.SUPPORT_POLLING_DAY)[columns],
        draws_of(turned, Quantity.SUPPORT_POLLING_DAY)[columns],
    )
    assert set(REGIONS) == {"R1", "R2"}


def test_the_truth_of_an_untidy_election_leaves_out_what_cannot_be_wrong() -> None:
    """R4 votes and is counted before the register ends; the regional party stands in R1 and R2 only."""
    election = draw_invented_election(COUNTED_SEED, size=SMALL_UNTIDY)
    assert election.inputs.counted_result is not None
    truth = election.truth
    polling_day = truth[truth["quantity"] == Quantity.SUPPORT_POLLING_DAY]
    assert set(polling_day["region"]) == {"", "R1", "R2", "R3"}
    assert set(polling_day[polling_day["code"] == "PR"]["region"]) == {"", "R1", "R2"}
    assert polling_day.groupby("region")["truth"].sum().tolist() == pytest.approx([100.0] * 4)
    # The country: support of regions still open, votes of the counted one, by turnout.
    drawn = draw_habits(SMALL_UNTIDY, rng=np.random.default_rng([COUNTED_SEED, HABITS_STREAM]))
    told = simulate_election(COUNTED_SEED, size=drawn).truth
    turnout = told.regions.set_index("region")["weight_polling_day"]
    first = told.polling_day[told.polling_day["code"] == "P1"].set_index("region")
    shares = [first.loc[region, "votes" if region == "R4" else "support"] for region in turnout.index]
    country = polling_day[(polling_day["region"] == "") & (polling_day["code"] == "P1")]
    assert country["truth"].item() == pytest.approx(shares @ turnout)
    assert truth[truth["quantity"] == Quantity.SEATS]["truth"].sum() == 12
    assert len(election.winners) == 12


def test_an_invented_election_is_read_as_of_its_registers_end(tiny: InventedElection) -> None:
    inputs = tiny.inputs
    assert (inputs.contest.last_polling_day - inputs.run_date).days == tiny.silent_days
    assert inputs.polls["published"].max().date() <= inputs.run_date
    assert not inputs.unpublished
    assert not inputs.folder.exists()


def test_silence_and_speed_differ_from_country_to_country() -> None:
    rng = np.random.default_rng(1)
    drawn = [draw_habits(TINY, rng=rng) for _ in range(400)]
    silent = [size.silent_days for size in drawn]
    assert (min(silent), max(silent)) == (2, 28)
    speeds = np.array([size.drift for size in drawn])
    assert np.median(speeds) == pytest.approx(1, abs=0.1)
    assert ((speeds >= 0.5) & (speeds <= 2)).mean() == pytest.approx(0.9, abs=0.05)
    assert {replace(size, silent_days=8, drift=1.0) for size in drawn} == {TINY}
