r"""Polls unlike their house's own habit: size of the sample, interviews per day, days until publication.

Habits are compared on a log scale, robustly: centre the median of the house's polls, scale the largest of
the house's own 1.4826 · MAD, that of the whole register about its houses' medians, and a floor, so that a
house which always prints 1,000 is not asked about 1,010. A poll is asked about where it is further out than a
normal variable would be once in twenty registers, all polls and sides counted (Bonferroni), the median's own
error :math:`\pi / 2k` added to the variance.

References
----------
Rousseeuw & Croux (1993), "Alternatives to the median absolute deviation", JASA 88:1273–1283.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pandas as pd
from scipy.stats import median_abs_deviation, norm

from aggregator.screens.questions import LEVEL, Question, Screen, joined_polls

# Fewer polls make no habit.
FEWEST_POLLS = 5
# Log units: samples and paces differ by a fifth, days until publication by half, without any reason to ask.
SIZE_FLOOR, PACE_FLOOR, DELAY_FLOOR = 0.2, 0.3, 0.4


@dataclass(frozen=True)
class _Odd:
    """A poll far from a habit."""

    poll: pd.Series
    usual: float
    value: float
    polls: int


def ask_about_sample_sizes(table: pd.DataFrame) -> list[Question]:
    """Ask about samples far from what the house usually has, national and regional polls apart.

    Parameters
    ----------
    table
        One row per poll, as ``poll_table`` builds it.
    """
    return [
        Question(
            Screen.SAMPLE_SIZE, odd.poll["house"], "", joined_polls([odd.poll["poll"]]),
            f"{odd.value:.0f} respondents",
            f"{odd.usual:.0f} (median of {odd.polls} {odd.poll['kind']} polls of the house)",
            "Was this an occasional larger or smaller poll, are samples of several polls or regions joined "
            "or split, or was a digit lost or added on the way into the register?",
        )
        for odd in _far_from_habit(
            table, table["sample"], by=["house", "kind"], floor=SIZE_FLOOR, sides=(-1, 1)
        )
    ]  # fmt: skip


def ask_about_timing(table: pd.DataFrame) -> list[Question]:
    """Ask where window, publication and sample do not fit the house's habit.

    Interviews per day are compared with the house's own, and where it has too few polls, with all polls of
    its mode. Days until publication only count where the poll came out sooner than the house usually manages.

    Parameters
    ----------
    table
        One row per poll, as ``poll_table`` builds it.
    """
    pace = table["sample"] / table["days"]
    counts = table["house"].value_counts()
    unknown = set(counts.index[counts < FEWEST_POLLS])
    fast = [
        *_far_from_habit(table, pace, by=["house"], floor=PACE_FLOOR, sides=(1,)),
        *(
            odd
            for odd in _far_from_habit(table, pace, by=["mode"], floor=PACE_FLOOR, sides=(1,))
            if odd.poll["mode"] and odd.poll["house"] in unknown
        ),
    ]
    delay = (table["published"] - table["end"]).dt.days.clip(lower=0) + 1.0
    soon = _far_from_habit(table, delay, by=["house"], floor=DELAY_FLOOR, sides=(-1,))
    return [_pace_question(odd) for odd in fast] + [_delay_question(odd) for odd in soon]


def _far_from_habit(
    table: pd.DataFrame, values: pd.Series, *, by: list[str], floor: float, sides: tuple[int, ...]
) -> Iterator[_Odd]:
    logs = np.log(values)
    groups = logs.groupby([table[name] for name in by])
    size, centre = groups.transform("size"), groups.transform("median")
    enough = size >= FEWEST_POLLS
    if not enough.any():
        return
    apart = logs - centre
    own = groups.transform(lambda of_house: median_abs_deviation(of_house, scale="normal"))
    everyone = float(median_abs_deviation(apart[enough], scale="normal"))
    scale = np.maximum(np.maximum(own, everyone), floor) * np.sqrt(1 + np.pi / (2 * size))
    limit = norm.isf(LEVEL / (int(enough.sum()) * len(sides)))
    for side in sides:
        for place in table.index[enough & (side * apart > limit * scale)]:
            yield _Odd(table.loc[place], float(np.exp(centre[place])), float(values[place]), int(size[place]))


def _pace_question(odd: _Odd) -> Question:
    poll = odd.poll
    return Question(
        Screen.TIMING, poll["house"], "", joined_polls([poll["poll"]]),
        f"{odd.value:.0f} interviews a day ({poll['sample']:.0f} in {poll['days']} day(s)"
        + (f", {poll['mode']})" if poll["mode"] else ")"),
        f"{odd.usual:.0f} a day (median of {odd.polls} polls)",
        "Was the first day of fieldwork left blank or mistyped, was the method another one this time, or "
        "does the sample hold interviews from before the window?",
    )  # fmt: skip


def _delay_question(odd: _Odd) -> Question:
    poll = odd.poll
    return Question(
        Screen.TIMING, poll["house"], "", joined_polls([poll["poll"]]),
        f"published {odd.value - 1:.0f} day(s) after fieldwork ended",
        f"{odd.usual - 1:.0f} days (median of {odd.polls} polls of the house)",
        "Was the day of publication left blank or mistyped (a blank is read as the last day of fieldwork), "
        "were the figures a first count, or did a sponsor ask for haste?",
    )  # fmt: skip
