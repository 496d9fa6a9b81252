"""Opinion time by day and draw: how much opinion may have moved between two days."""

from __future__ import annotations

from datetime import date

import numpy as np
import pandas as pd

from aggregator.estimate.knots import DAYS_PER_WEEK
from models.arrays import Floats, KnotArrays
from models.opinion_time import opinion_weeks, ramp_strength

# The ages at which a release states a poll's worth reach this far back.
LEAST_DAYS_BACK = 90


def clock_days(dates: pd.DatetimeIndex, *, last_voting: date) -> pd.DatetimeIndex:
    """Every day from the first date of the series, or a quarter of a year before the last, to polling day."""
    first = min(dates[0], dates[-1] - pd.Timedelta(days=LEAST_DAYS_BACK))
    return pd.date_range(first, max(pd.Timestamp(last_voting), dates[-1]))


def opinion_clock(
    ramp: Floats, *, knots: KnotArrays, jolts: dict[date, float], days: pd.DatetimeIndex, last_voting: date
) -> Floats:
    """Opinion weeks since the first day, dims (sample, day).

    Parameters
    ----------
    ramp
        Log height of the ramp, dims (sample).
    jolts
        Weeks that each jolt adds on its day.
    """
    end = float(last_voting.toordinal())
    day = np.array([d.toordinal() for d in days], dtype=float)
    before, after = np.minimum(day[:-1], end), np.minimum(day[1:], end)
    strength = ramp_strength(before, after, polling_day=end) * float(knots.has_ramp)
    weeks = opinion_weeks(
        (after - before) / DAYS_PER_WEEK,
        jolt=np.array([jolts.get(d.date(), 0.0) for d in days[1:]]),
        ramp=strength,
        log_height=ramp[:, None],
        exp=np.exp,
    )
    return np.concatenate([np.zeros((len(ramp), 1)), np.cumsum(weeks, axis=1)], axis=1)
