"""A made-up tracking poll: windows that overlap share the very interviews."""

from dataclasses import replace
from datetime import timedelta

import numpy as np
import pandas as pd
import pytest

from data_demo.made_up_country import draw_country
from data_demo.made_up_election import UNTIDY_ELECTION, MadeUpElection, simulate_election
from data_demo.made_up_leans import draw_house_truth
from data_demo.made_up_scenery import MadeUpTracker
from data_demo.made_up_schedule import draw_schedule
from data_demo.made_up_size import draw_scenery
from data_demo.made_up_tracker import draw_interviews, window_rows

QUICK_TRACKER = replace(UNTIDY_ELECTION, polls=40, weeks=30, polled_weeks=28, seats=16)


@pytest.fixture(scope="module")
def election() -> MadeUpElection:
    return simulate_election(6, size=QUICK_TRACKER)


def windows_of(election: MadeUpElection) -> pd.DataFrame:
    return election.polls[election.polls["poll"].str.contains("-T")]


def test_each_window_is_the_sum_of_its_days_interviews(election: MadeUpElection) -> None:
    windows, daily = windows_of(election), election.truth.interviews
    house = next(h for h in election.scenery.houses if h.tracker)
    assert len(windows) >= 8
    for window in windows.to_dict("records"):
        days = daily[daily["date"].between(window["start"], window["end"])]
        assert days["date"].nunique() == house.tracker.window_days
        asked = days.drop_duplicates("date")["asked"].sum()
        answers = days.groupby("code")["answers"].sum()
        base = asked if house.undecided is not None else answers.sum()
        assert window["sample"] == asked
        for code, count in answers.items():
            if not pd.isna(window[code]):
                assert window[code] == pytest.approx(100 * count / base, abs=house.grid / 2 + 1e-9)


def test_windows_overlap_and_the_house_runs_no_other_poll_meanwhile(election: MadeUpElection) -> None:
    windows = windows_of(election).sort_values("end")
    starts, ends = windows["start"].to_numpy(), windows["end"].to_numpy()
    assert (starts[1:] <= ends[:-1]).all()
    assert windows["sponsor"].nunique() == 1
    assert windows["published"].max() <= str(election.scenery.register_end)
    others = election.polls[election.polls["house"].eq(windows["house"].iloc[0])].drop(windows.index)
    assert others["end"].max() < starts[0]


def test_windows_stray_by_their_design_effect_and_only_as_far_as_they_share_interviews() -> None:
    """Variance of a window's share, and the correlation of two: the part of the days they share."""
    scenery = draw_scenery(QUICK_TRACKER, rng=np.random.default_rng(0))
    # A country that hardly moves, so that the windows' expected answers are one.
    still = replace(scenery, drift=1e-6, jolts=())
    house = next(i for i, h in enumerate(still.houses) if h.tracker)
    # Eleven days: four windows of five days, every other day.
    last_days = MadeUpTracker(still.register_end - timedelta(days=11))
    tracker = replace(still.houses[house], grid=0.1, undecided=None, lumps=(), pools=(), tracker=last_days)
    still = replace(still, houses=(*still.houses[:house], tracker, *still.houses[house + 1 :]))
    country = draw_country(still, shared_lean=True, rng=np.random.default_rng(1))
    schedule = draw_schedule(country, rng=np.random.default_rng(2))
    houses = draw_house_truth(country, schedule=schedule, rng=np.random.default_rng(3))
    shares, samples = [], []
    for seed in range(250):
        daily = draw_interviews(country, houses=houses, house=house, rng=np.random.default_rng([4, seed]))
        rows = window_rows(daily, house=tracker, kappa=1.0)
        shares.append([row["P1"] for row in rows])
        samples.append([row["sample"] for row in rows])
    found = np.array(shares, dtype=float) / 100
    size = float(np.mean(samples))
    share = found.mean()
    expected = share * (1 - share) / size * houses.design_effect(house, respondents=size)
    assert found.var(axis=0).mean() == pytest.approx(expected, rel=0.15)
    correlation = np.corrcoef(found.T)
    # Of five days three are shared with the next window, one with the one after, none with the last.
    assert correlation[[0, 1, 2], [1, 2, 3]].mean() == pytest.approx(0.6, abs=0.1)
    assert correlation[[0, 1], [2, 3]].mean() == pytest.approx(0.2, abs=0.13)
    assert correlation[0, 3] == pytest.approx(0, abs=0.2)


def test_a_house_without_a_tracker_is_refused_by_name(election: MadeUpElection) -> None:
    house = next(h for h in election.scenery.houses if h.tracker is None)
    with pytest.raises(ValueError, match=house.name):
        window_rows(election.truth.interviews, house=house, kappa=1.0)
