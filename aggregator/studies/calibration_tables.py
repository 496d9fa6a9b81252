"""The tables of a calibration's page: numbers as text, with their interval beside them."""

from __future__ import annotations

from collections.abc import Hashable, Mapping
from typing import Any

import numpy as np
import pandas as pd

from aggregator.release.page_tables import PageTable
from aggregator.replays.distribution_scores import INTERVALS
from aggregator.studies.calibration_report import CalibrationReport

SEEN_CHANGE = 5.0
"""Things that are said about hardly more elections than before (in points) are left to ``alarms.csv``."""


def page_tables(report: CalibrationReport) -> dict[str, PageTable]:
    """Every table of the page, by the name its template knows."""
    tables = {
        "coverage": coverage_table(report),
        "scores": scores_table(report),
        "places": places_table(report),
    }
    if report.verdict is not None:
        tables["verdict"] = verdict_table(report.verdict.table)
    if report.damage is not None:
        tables["damage"] = damage_table(report.damage)
    if report.alarms is not None:
        tables["alarms"] = alarms_table(report.alarms)
    return tables


def verdict_table(checks: pd.DataFrame) -> PageTable:
    """Each check, what was found, what it is held to."""
    rows = tuple(
        (
            str(row["check"]),
            f"{row['value']:g}",
            str(row["limit"]),
            "holds" if row["passed"] else f"fails: {row['meaning']}",
        )
        for row in checks.to_dict("records")
    )
    return PageTable(
        "What is checked, what was found, and the limits fixed before.",
        ("check", "found", "limit", "outcome"),
        rows,
        frozenset({0, 3}),
    )


def coverage_table(report: CalibrationReport) -> PageTable:
    """Percent of the intervals that hold the truth, by group."""
    rows = []
    for group, found in report.coverage.groupby("group", sort=False):
        by_percent = {row["stated"]: row for row in found.to_dict("records")}
        cells = [
            f"{by_percent[percent]['inside']:.1f} %" + _below(by_percent[percent], decimals=1)
            for percent in INTERVALS
        ]
        rows.append((str(group), f"{by_percent[INTERVALS[0]]['intervals']:,}", *cells))
    return PageTable(
        "Percent of the intervals that hold the truth, and its 95 % interval when whole elections are drawn "
        "again. Seats are whole numbers: their intervals hold at least what they state.",
        ("numbers", "intervals", *(f"{percent} % intervals" for percent in INTERVALS)),
        tuple(rows),
    )


def scores_table(report: CalibrationReport) -> PageTable:
    """Mean error, CRPS and width of 90 % intervals."""
    rows = tuple(
        (
            str(row["group"]),
            f"{row['mean_absolute_error']:.2f}",
            f"{row['crps']:.2f}",
            f"{row['width_90']:.1f}",
        )
        for row in report.scores.to_dict("records")
    )
    return PageTable(
        "How near the estimates are: points for support, seats for seats.",
        ("numbers", "mean absolute error", "CRPS", "mean width of the 90 % interval"),
        rows,
    )


def places_table(report: CalibrationReport) -> PageTable:
    """Places of the truth, judged."""
    rows = tuple(
        (
            str(row["kind"]),
            str(row["code"]),
            "inside" if row["inside"] else "outside",
            f"{row['chance']:.3f}",
            f"{row['bias']:+.1f}",
            f"{row['spread']:.2f}",
        )
        for row in report.uniformity.to_dict("records")
    )
    return PageTable(
        "Places of the truth among the draws, one per election. Chance: of uniform places that stray as far, "
        "by a second test. Bias: mean place less a half, in standard errors. Spread: above 1 where intervals "
        "are too narrow.",
        ("numbers", "code", "band", "chance", "bias", "spread"),
        rows,
        frozenset({0, 1, 2}),
    )


def damage_table(damage: pd.DataFrame) -> PageTable:
    """What the violation breaks, group by group."""
    rows = tuple(
        (
            str(row["group"]),
            f"{row['inside_honest']:.1f} %",
            f"{row['inside_violated']:.1f} %",
            f"{row['crps_ratio']:.2f}" + _below(row, decimals=2),
            f"{row['error_ratio']:.2f}",
            f"{row['width_ratio']:.2f}",
        )
        for row in damage.to_dict("records")
    )
    return PageTable(
        "The same elections without and with it: percent of the 90 % intervals that hold the truth, and "
        "CRPS, error and width with it as multiples of those without.",
        ("numbers", "90 % without", "90 % with", "CRPS", "error", "width"),
        rows,
    )


def alarms_table(alarms: pd.DataFrame) -> PageTable:
    """What the program says about more elections because of the violation."""
    more = alarms[(alarms["violated"] - alarms["honest"]).abs() >= SEEN_CHANGE]
    rows = tuple(
        (f"{row['kind']}: {row['name']}", f"{row['honest']:.0f} %", f"{row['violated']:.0f} %")
        for row in more.to_dict("records")
    )
    return PageTable(
        "Part of the elections in which the program says so, where that changes by "
        f"{SEEN_CHANGE:g} points or more.",
        ("what is said", "without", "with"),
        rows,
    )


def _below(row: Mapping[Hashable, Any], *, decimals: int) -> str:
    """Put the bootstrap interval on a line of its own; nothing for a single election."""
    if np.isnan(row["low"]):
        return ""
    return f"\n{row['low']:.{decimals}f} to {row['high']:.{decimals}f}"
