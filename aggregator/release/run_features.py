"""What the model had to bear in this run, feature by feature, in words."""

from __future__ import annotations

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
import xarray as xr

from aggregator.release.contents import Pace, ReleaseContents
from aggregator.release.mode_leans_table import told_words
from aggregator.release.rounding import date_text, whole_text
from aggregator.release.table_words import LeanKind


class Feature(NamedTuple):
    """One feature of the model that was in use: what it is called, and what it was about in this run."""

    heading: str
    text: str


def describe_features(contents: ReleaseContents) -> list[Feature]:
    """List what was in use in this run, in the order of the method."""
    return [
        *_ways_of_working(contents),
        *_ways_of_asking(contents),
        *_pace(contents),
        *_jolts(contents),
        *_phases(contents),
    ]


def summarise_pace(draws: xr.Dataset, *, prior_sd: float | None) -> Pace | None:
    """Summarise how fast opinion moves on polling day, over its usual pace; None where it runs evenly.

    Parameters
    ----------
    draws
        With ``ramp_log_height`` (chain, draw) where the pace may change.
    prior_sd
        Standard deviation of that number before the polls; None where it is not known.
    """
    if "ramp_log_height" not in draws:
        return None
    height = draws["ramp_log_height"].to_numpy()
    low, middle, high = np.exp(np.quantile(height, [0.05, 0.5, 0.95])).tolist()
    told = None if prior_sd is None else max(0.0, 1 - float(height.var()) / prior_sd**2)
    return Pace(middle, low, high, told)


def _ways_of_working(contents: ReleaseContents) -> Iterator[Feature]:
    houses = contents.tables.houses[["house", "method"]].drop_duplicates()
    several = houses[houses["method"] != ""].groupby("house", sort=False)["method"].agg(list)
    if len(several):
        listed = "; ".join(f"{house}: {', '.join(labels)}" for house, labels in several.items())
        yield Feature(
            "Ways of working",
            "A house that changes its way of working starts a new lean, which is pulled to its old one. "
            f"In this register: {listed}.",
        )


def _ways_of_asking(contents: ReleaseContents) -> Iterator[Feature]:
    table = contents.tables.mode_leans
    for kind, heading, opening in (
        (
            LeanKind.MODE,
            "Modes",
            "How people are asked has a lean of its own beside the house's; the leans of all modes, weighed "
            "by their houses, sum to zero, so that they move no estimate of support by themselves",
        ),
        (
            LeanKind.POPULATION,
            "Populations",
            "Polls of another population than the contest's have a lean against it; the contest's is "
            f"{contents.contest.model.target_population}",
        ),
        (
            LeanKind.ASKED_TOGETHER,
            "Alliances asked about as one",
            "An alliance's figure may differ when people are asked about it as one and not about its members",
        ),
    ):
        rows = table[table["kind"] == kind]
        if len(rows):
            told = rows.groupby("label", sort=False)["learned"].median()
            listed = "; ".join(
                f"{contents.names.get(str(label), str(label).replace('_', ' '))}: {told_words(value)}"
                for label, value in told.items()
            )
            yield Feature(
                heading, f"{opening}. How far the polls tell it from what is the houses' own: {listed}."
            )


def _pace(contents: ReleaseContents) -> Iterator[Feature]:
    pace = contents.pace
    if pace is None:
        yield Feature("Pace", "Opinion is taken to move as fast before polling day as ever.")
        return
    told = "" if pace.told is None else f" How far the polls tell it: {told_words(pace.told)}."
    yield Feature(
        "Pace",
        "In the last 60 days before polling day opinion may move faster or slower than usual. On polling day "
        f"itself it moves at {pace.middle:.1f} times its usual pace (90 % interval {pace.low:.1f} to "
        f"{pace.high:.1f}).{told}",
    )


def _jolts(contents: ReleaseContents) -> Iterator[Feature]:
    seen = [jolt for jolt in contents.contest.jolts if jolt.date <= contents.contest.last_polling_day]
    if seen:
        listed = "; ".join(
            f"{date_text(jolt.date)}{f', {jolt.name}' if jolt.name else ''}: {jolt.weeks:g} weeks' worth"
            for jolt in sorted(seen, key=lambda jolt: jolt.date)
        )
        yield Feature(
            "Jolts",
            "On days that the desk names, opinion may jump by some weeks' worth of usual movement; whether "
            f"it did, and which way, the polls say. {listed}.",
        )


def _phases(contents: ReleaseContents) -> Iterator[Feature]:
    contest = contents.contest
    days: dict[str, list[str]] = {}
    for region in sorted(contest.regions, key=lambda region: contest.polling_day_of(region.code)):
        days.setdefault(date_text(contest.polling_day_of(region.code)), []).append(region.name)
    if len(days) < 2:
        return
    listed = "; ".join(f"{day}: {', '.join(names)}" for day, names in days.items())
    yield Feature(
        "Voting in phases",
        f"Regions vote on different days. A region's support stays as it is once it has voted. {listed}.",
    )
    counted = contents.inputs.counted_result
    if counted is not None and len(counted):
        names = [contents.region_names.get(code, code) for code in counted["region"].unique()]
        yield Feature(
            "Counted regions",
            f"Counted already: {', '.join(names)}. Their count stands in the place of an estimate "
            f"({whole_text(counted['seat'].nunique())} seats or rows of votes), and tells the model how far "
            "polls were off there.",
        )
