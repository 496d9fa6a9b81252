"""Opinion time: how far opinion has had time to move between two days, draw by draw.

A week of opinion time is a week of usual movement. It runs with the calendar, but may race or rest before
polling day, and jumps where the desk names a day on which opinion may have jumped.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
import xarray as xr

from models.dimensions import DAY

DAYS_PER_WEEK = 7.0


def weeks_between(
    draws: xr.Dataset, *, earlier: Sequence[pd.Timestamp], later: pd.Timestamp, dim: str
) -> xr.DataArray:
    """Weeks of opinion time from some days to a later one.

    Parameters
    ----------
    draws
        Needs ``opinion_clock`` (chain, draw, day), weeks since its first day. Before that day the calendar
        stands in for it; after its last day, when everyone has voted, it rests.
    earlier
        Days, hours included.
    later
        One day; what lies after it counts as nothing.
    dim
        Name of the dim of the result that runs over ``earlier``.

    Returns
    -------
    xr.DataArray
        dims (chain, draw, ``dim``), unit: weeks.
    """
    clock = draws["opinion_clock"]
    since = _read_clock(clock, days=earlier).rename({DAY: dim})
    until = _read_clock(clock, days=[later]).isel({DAY: 0})
    return (until - since).clip(min=0.0)


def age_in_days(draws: xr.Dataset, *, weeks: xr.DataArray, on: pd.Timestamp) -> xr.DataArray:
    """Days back from a day until some weeks of opinion time have passed: the reverse of `weeks_between`.

    Parameters
    ----------
    draws
        As for `weeks_between`.
    weeks
        Weeks of opinion time, dims (chain, draw).
    on
        The day to count back from.

    Returns
    -------
    xr.DataArray
        dims (chain, draw), unit: days.
    """
    clock = draws["opinion_clock"]
    wanted = _read_clock(clock, days=[on]).isel({DAY: 0}) - weeks
    day = _day_numbers(clock)

    def when(reading: np.ndarray, target: np.ndarray) -> np.ndarray:
        before = day[0] + DAYS_PER_WEEK * np.minimum(target, 0.0)
        return np.where(target < 0, before, np.interp(target, reading, day))

    found = xr.apply_ufunc(when, clock, wanted, input_core_dims=[[DAY], []], vectorize=True)
    return _number(on) - found


def _read_clock(clock: xr.DataArray, *, days: Sequence[pd.Timestamp]) -> xr.DataArray:
    """What the clock shows at some moments: dims (chain, draw, day), in straight lines between its days."""
    known = _day_numbers(clock)
    moments = np.array([_number(day) for day in days])
    after = np.clip(np.searchsorted(known, moments, side="right"), 1, len(known) - 1)
    part = xr.DataArray(
        np.clip((moments - known[after - 1]) / (known[after] - known[after - 1]), 0.0, 1.0), dims=DAY
    )
    before_first = xr.DataArray(np.minimum(moments - known[0], 0.0) / DAYS_PER_WEEK, dims=DAY)
    bare = clock.drop_vars(DAY)
    low, high = bare.isel({DAY: after - 1}), bare.isel({DAY: after})
    return low + part * (high - low) + before_first


def _day_numbers(clock: xr.DataArray) -> np.ndarray:
    return (clock[DAY].to_numpy() - np.datetime64(0, "D")) / np.timedelta64(1, "D")


def _number(day: pd.Timestamp) -> float:
    return (day - pd.Timestamp(0)) / pd.Timedelta(days=1)
