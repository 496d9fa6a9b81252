"""The days on which the model lets opinion bend, and how a fieldwork window sees them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

import numpy as np

from models.arrays import Floats, KnotArrays
from models.opinion_time import ramp_strength

DAYS_PER_WEEK = 7
# Weekly knots over the last half year, fortnightly before: fortnightly ones move no quantile by more than
# .2 points, and the last months are what the desk looks at.
WEEKLY_STRETCH_DAYS = 26 * DAYS_PER_WEEK
NATIONAL_STEPS_DAYS = (7, 14)
REGION_STEP_DAYS = 28


@dataclass(frozen=True)
class JoltDay:
    """A day on which opinion may have jumped, and the opinion time that adds, in weeks."""

    day: date
    weeks: float


def build_knots(
    *,
    last_result: date | None,
    first_fieldwork: date,
    middle_fieldwork: date,
    polling_day: date,
    jolts: Sequence[JoltDay] = (),
    ramp: bool = True,
) -> KnotArrays:
    """Lay the knots back from polling day, so that their number stays the same during a campaign.

    With a last result knot 0 is that day, and the stretch without polls after it is a single step.
    Without one the walk starts at the last knot before the first fieldwork. A jolt has a national knot of its
    own on its day and one on the day before; regions take it into the step it falls in.

    Parameters
    ----------
    last_result
        Day of the last result that anchors the walk, None without one.
    first_fieldwork, middle_fieldwork
        First day of fieldwork in the register, and its middle.
    polling_day
        Day of the last knot: the last day on which a region votes.
    jolts
        Days on which opinion may have jumped; those before knot 0 say nothing.
    ramp
        Whether opinion time may run faster or slower towards polling day.
    """
    span = (polling_day - first_fieldwork).days
    national = _days_back(span, weekly_stretch=WEEKLY_STRETCH_DAYS)
    region = np.arange(0, span + REGION_STEP_DAYS, REGION_STEP_DAYS, dtype=float)
    start = (polling_day - last_result).days if last_result is not None else None
    national_day, region_day = (_forward(back, start) for back in (national, region))
    length = national_day[-1]
    region_day = region_day + (length - region_day[-1])
    zero = polling_day.toordinal() - length
    jolt_day = np.array([jolt.day.toordinal() for jolt in jolts], dtype=float) - zero
    jolt_weeks = np.array([jolt.weeks for jolt in jolts], dtype=float)
    inside = jolt_day[jolt_day > national_day[1]]
    national_day = np.union1d(national_day, np.concatenate([inside - 1, inside]))
    steep = 1.0 if ramp else 0.0
    return KnotArrays(
        national_day=national_day,
        region_day=region_day,
        national_step=np.diff(national_day) / DAYS_PER_WEEK,
        region_step=np.diff(region_day) / DAYS_PER_WEEK,
        national_jolt=_jolts_of_steps(national_day, jolt_day, jolt_weeks),
        region_jolt=_jolts_of_steps(region_day, jolt_day, jolt_weeks),
        national_ramp=steep * ramp_strength(national_day[:-1], national_day[1:], polling_day=length),
        region_ramp=steep * ramp_strength(region_day[:-1], region_day[1:], polling_day=length),
        lean_clock=national_day / length,
        lean_reference=float(np.clip((middle_fieldwork.toordinal() - zero) / length, 0, 1)),
    )


def _jolts_of_steps(knot_day: Floats, jolt_day: Floats, jolt_weeks: Floats) -> Floats:
    """Weeks that jolts add to each step, dims (knot − 1); a jolt belongs to the step that ends on its day."""
    added = np.zeros(len(knot_day) - 1)
    step = np.searchsorted(knot_day, jolt_day, side="left") - 1
    inside = (step >= 0) & (step < len(added))
    np.add.at(added, step[inside], jolt_weeks[inside])
    return added


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


def knot_weights(
    knot_day: Floats, *, first_day: Floats, last_day: Floats, until: Floats | None = None
) -> Floats:
    """Weight of each knot on support averaged over each window of days.

    Parameters
    ----------
    knot_day
        Ascending days, dims (knot).
    first_day, last_day
        Both ends of the windows, included, dims (window).
    until
        The last day each window answers for, dims (window): later days count as that day.

    Returns
    -------
    dims (window, knot), rows sum to one.
    """
    weights = np.zeros((len(first_day), len(knot_day)))
    ends = np.full(len(first_day), knot_day[-1]) if until is None else np.minimum(until, knot_day[-1])
    for window, (first, last, end) in enumerate(zip(first_day, last_day, ends, strict=True)):
        days = np.clip(np.arange(first, last + 1), knot_day[0], end)
        left = np.clip(np.searchsorted(knot_day, days, side="right") - 1, 0, len(knot_day) - 2)
        share = (days - knot_day[left]) / (knot_day[left + 1] - knot_day[left])
        np.add.at(weights[window], left, (1 - share) / len(days))
        np.add.at(weights[window], left + 1, share / len(days))
    return weights
