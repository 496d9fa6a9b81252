"""How fast opinion moves in an invented country: a ramp, jolts, and regions that have voted."""

from __future__ import annotations

import numpy as np
import pandas as pd

from data_demo.made_up_scenery import Scenery

RAMP_DAYS = 60
"""The ramp begins this many days before the last polling day."""
RAMP_LOG_SD = 0.5
"""Sd of the ramp's log height over elections."""


def opinion_days(scenery: Scenery, *, days: pd.DatetimeIndex) -> np.ndarray:
    """Opinion time from each day's eve to the day, in usual days, dims (day,); zero on the first day.

    It runs at exp(g s), s rising from 0 at 60 days before polling day to 1 on it, and a jolt adds its weeks.
    """
    left = (days[-1] - days).days.to_numpy() + 0.5
    passed = np.exp(scenery.ramp_log_height * np.maximum(0, 1 - left / RAMP_DAYS))
    passed[0] = 0.0
    for jolt in scenery.jolts:
        passed[days.get_loc(pd.Timestamp(jolt.day))] += 7 * jolt.weeks
    return passed


def still_after_voting(log_support: np.ndarray, *, scenery: Scenery, days: pd.DatetimeIndex) -> np.ndarray:
    """Support by day, dims (day, region, party), where a region's stands still from its polling day on."""
    held = log_support.copy()
    for r, region in enumerate(scenery.regions):
        if region.polling_day is not None:
            voted = days.get_loc(pd.Timestamp(region.polling_day))
            held[voted:, r] = held[voted, r]
    return held
