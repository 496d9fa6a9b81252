"""The days on which the model lets opinion bend, and how a fieldwork window sees them."""

from __future__ import annotations

from datetime import date

import numpy as np

from models.arrays import Floats, KnotArrays

DAYS_PER_WEEK = 7
# Weekly knots over the last half year, fortnightly before: fortnightly ones move no quantile by more than
# .2 points, and the last months are what the desk looks at.
WEEKLY_STRETCH_DAYS = 26 * DAYS_PER_WEEK
NATIONAL_STEPS_DAYS = (7, 14)
REGION_STEP_DAYS = 28


def build_knots(
    *, last_result: date | None, first_fieldwork: date, middle_fieldwork: date, polling_day: date
) -> KnotArrays:
    """Lay the knots back from polling day, so that their number stays the same during a campaign.

    With a last result knot 0 is that day, and the stretch without polls after it is a single step.
    Without one the walk starts at the last knot before the first fieldwork.

    Parameters
    ----------
    last_result
        Day of the last result that anchors the walk, None without one.
    first_fieldwork, middle_fieldwork
        First day of fieldwork in the register, and its middle.
    polling_day
        Day of the last knot.
    """
    span = (polling_day - first_fieldwork).days
    national = _days_back(span, weekly_stretch=WEEKLY_STRETCH_DAYS)
    region = np.arange(0, span + REGION_STEP_DAYS, REGION_STEP_DAYS, dtype=float)
    start = (polling_day - last_result).days if last_result is not None else None
    national_day, region_day = (_forward(back, start) for back in (national, region))
    length = national_day[-1]
    zero = polling_day.toordinal() - length
    clock = national_day / length
    return KnotArrays(
        national_day=national_day,
        region_day=region_day + (length - region_day[-1]),
        national_step=np.diff(national_day) / DAYS_PER_WEEK,
        region_step=np.diff(region_day) / DAYS_PER_WEEK,
        lean_clock=clock,
        lean_reference=float(np.clip((middle_fieldwork.toordinal() - zero) / length, 0, 1)),
    )


def _days_back(span: int, *, weekly_stretch: int) -> Floats:
    """Days before polling day of each knot, nearest first, reaching at least ``span`` days back."""
    near, far = NATIONAL_STEPS_DAYS
    days = [0]
    while days[-1] < span:
        days.append(days[-1] + (near if days[-1] < weekly_stretch else far))
    return np.array(days, dtype=float)


def _forward(days_back: Floats, start_back: int | None) -> Floats:
    """Days since knot 0, ascending; the start replaces every knot at or before it."""
    if start_back is not None:
        days_back = np.append(days_back[days_back < start_back], start_back)
    if len(days_back) == 1:
        days_back = np.append(days_back, days_back[-1] + DAYS_PER_WEEK)
    return (days_back.max() - np.sort(days_back)[::-1]).astype(float)


def knot_weights(knot_day: Floats, *, first_day: Floats, last_day: Floats) -> Floats:
    """Weight of each knot on support averaged over each window of days.

    Parameters
    ----------
    knot_day
        Ascending days, dims (knot).
    first_day, last_day
        Both ends of the windows, included, dims (window).

    Returns
    -------
    dims (window, knot), rows sum to one.
    """
    weights = np.zeros((len(first_day), len(knot_day)))
    for window, (first, last) in enumerate(zip(first_day, last_day, strict=True)):
        days = np.clip(np.arange(first, last + 1), knot_day[0], knot_day[-1])
        left = np.clip(np.searchsorted(knot_day, days, side="right") - 1, 0, len(knot_day) - 2)
        share = (days - knot_day[left]) / (knot_day[left + 1] - knot_day[left])
        np.add.at(weights[window], left, (1 - share) / len(days))
        np.add.at(weights[window], left + 1, share / len(days))
    return weights
