"""Opinion time between two days: with the calendar, over a jolt, before the first day, after the last."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.shelf_life.opinion_clock import age_in_days, weeks_between
from tests.made_up_draws import POLLING_DAY, RUN_DATE, calendar_clock, made_up_draws

RUN = pd.Timestamp(RUN_DATE)


@pytest.fixture(scope="module")
def draws() -> xr.Dataset:
    return made_up_draws(draws=20)


def weeks(draws: xr.Dataset, *earlier: str, later: pd.Timestamp = RUN) -> np.ndarray:
    days = [pd.Timestamp(day) for day in earlier]
    return weeks_between(draws, earlier=days, later=later, dim="age_days").to_numpy()


def test_steady_opinion_ages_by_the_calendar_hours_included(draws: xr.Dataset) -> None:
    found = weeks(calendar_clock(draws), "2033-02-27", "2033-02-27 12:00", "2033-03-06")
    np.testing.assert_allclose(found, np.broadcast_to([1, 6.5 / 7, 0], found.shape))


def test_racing_opinion_ages_a_poll_faster_in_the_draws_in_which_it_races(draws: xr.Dataset) -> None:
    last_month = weeks(draws, "2033-04-15", later=pd.Timestamp(POLLING_DAY))[..., 0]
    races = draws["ramp_log_height"].to_numpy() > 0
    assert (last_month[races] > 30 / 7).all()
    assert (last_month[~races] < 30 / 7).all()


def test_days_before_the_clock_starts_age_by_the_calendar(draws: xr.Dataset) -> None:
    first = pd.Timestamp(draws["day"].values[0])
    known, before = weeks(draws, str(first.date())), weeks(draws, str((first - pd.Timedelta(days=70)).date()))
    np.testing.assert_allclose(before, known + 10)


def test_nothing_ages_after_the_last_region_has_voted(draws: xr.Dataset) -> None:
    late = pd.Timestamp("2033-07-01")
    np.testing.assert_allclose(weeks(draws, str(POLLING_DAY), later=late), 0)


def test_day_that_lies_ahead_has_no_age(draws: xr.Dataset) -> None:
    np.testing.assert_allclose(weeks(draws, "2033-04-01"), 0)


def test_age_in_days_is_the_reverse_of_weeks_between(draws: xr.Dataset) -> None:
    for days in (0, 3.5, 40, 89, 200):
        taken = RUN - pd.Timedelta(days=days)
        passed = weeks_between(draws, earlier=[taken], later=RUN, dim="age_days").isel(age_days=0)
        np.testing.assert_allclose(age_in_days(draws, weeks=passed, on=RUN), days, atol=1e-9)
