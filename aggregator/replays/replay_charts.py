"""The charts of a replay report, each with its reading help and an alt text that holds the numbers."""

from __future__ import annotations

import pandas as pd

from aggregator.release.charts import ReleaseChart
from aggregator.release.rounding import share_text, whole_text
from aggregator.release.table_words import Level
from aggregator.replays.calibration_charts import build_places_chart, build_reliability_chart
from aggregator.replays.error_chart import build_error_chart, errors_by_days
from aggregator.replays.history_chart import build_history_chart
from aggregator.replays.methods import METHOD_NAMES, Method, Quantity
from aggregator.replays.replay_words import UNIT
from aggregator.replays.report_contents import ReportContents
from aggregator.replays.staleness_chart import build_staleness_chart

_QUANTITIES = (Quantity.SUPPORT, Quantity.SEATS)


def build_replay_charts(contents: ReportContents) -> tuple[ReleaseChart, ...]:
    """All charts a report has; those about seats only where seats are scored."""
    quantities = _QUANTITIES if contents.has_seats else _QUANTITIES[:1]
    charts = [] if contents.is_pooled else [_history_chart(contents, quantity) for quantity in quantities]
    charts += [_error_chart(contents, quantity) for quantity in quantities]
    charts.append(_places_chart(contents))
    if len(contents.reliability):
        charts.append(_reliability_chart(contents))
    if (contents.staleness["code"] == "").any():
        charts.append(_staleness_chart(contents))
    return tuple(charts)


def _said(text: str, contents: ReportContents) -> str:
    return " ".join([*contents.alarms, text])


def _history_chart(contents: ReportContents, quantity: Quantity) -> ReleaseChart:
    rows = contents.own[contents.own["quantity"] == quantity]
    support = quantity is Quantity.SUPPORT
    title = f"{'Support' if support else 'Seats'} on polling day, as each replayed date saw it"
    first, last = (
        rows[rows["as_of"] == day].set_index("code") for day in (rows["as_of"].min(), rows["as_of"].max())
    )
    decimals = 1 if support else 0
    parts = [
        f"{look.name} {first.loc[look.code, 'estimate']:.{decimals}f} at first, "
        f"{last.loc[look.code, 'estimate']:.{decimals}f} "
        f"at last, result {last.loc[look.code, 'truth']:.{decimals}f}"
        for look in contents.looks
        if look.code in last.index and look.code in first.index
    ]
    return ReleaseChart(
        name=f"{quantity}_over_replays",
        title=title,
        reading="Line and points: mean; band: 90 % interval; dashed line, and number: the result. Each panel "
        "has its own "
        f"scale, in {'percent of the vote' if support else 'seats'}. An alliance is the sum of its members.",
        alt_text=_said(f"{title}. {'; '.join(parts)}.", contents),
        draw=lambda layout: build_history_chart(
            rows, looks=contents.looks, unit=" %" if support else "", decimals=decimals, layout=layout
        ),
    )


def _error_chart(contents: ReportContents, quantity: Quantity) -> ReleaseChart:
    errors = errors_by_days(contents.scores, quantity=quantity)
    support = quantity is Quantity.SUPPORT
    title = f"How far off {'support' if support else 'seats'} was, by days before polling day"
    if not support:
        title = "How far off seats were, by days before polling day"
    parts = []
    for method in Method:
        rows = errors[errors["method"] == method].sort_values("days_before")
        if len(rows):
            ends = [share_text(rows["error"].iloc[place], unit=False) for place in (-1, 0)]
            days = [whole_text(rows["days_before"].iloc[place]) for place in (-1, 0)]
            parts.append(f"{METHOD_NAMES[method]} {ends[0]} at {days[0]} days, {ends[1]} at {days[1]}")
    return ReleaseChart(
        name=f"{quantity}_error_by_days",
        title=title,
        reading=f"Mean absolute error over parties and others, in {UNIT[quantity]}: this model, and what a "
        "desk could say without one. Smaller is better.",
        alt_text=_said(f"{title}. Mean absolute error in {UNIT[quantity]}: {'; '.join(parts)}.", contents),
        draw=lambda layout: build_error_chart(errors, unit=UNIT[quantity], layout=layout),
    )


def _places_chart(contents: ReportContents) -> ReleaseChart:
    places = contents.places
    title = "Where the result lay among the draws"
    parts = [
        f"{quantity}: " + ", ".join(f"{100 * share:.0f} %" for share in rows["share"])
        for quantity, rows in places.groupby("quantity", sort=False)
    ]
    return ReleaseChart(
        name="places",
        title=title,
        reading="Flat at the dashed line: intervals are right. Heaped in the middle: too wide; at both ends: "
        "too narrow; at one end: one-sided. Grey: where a tenth would end with chance 90 % if each party "
        "counted once per contest; since parties and dates hang together, only many contests show more "
        "than a rough shape.",
        alt_text=_said(f"{title}. Share of forecasts by tenth, lowest first: {'; '.join(parts)}.", contents),
        draw=lambda layout: build_places_chart(places, layout=layout),
    )


def _reliability_chart(contents: ReportContents) -> ReleaseChart:
    table = contents.reliability
    title = "Did chances of seats come true as often as they said?"
    parts = [
        f"{100 * row['mean_chance']:.0f} % given, {100 * row['share_won']:.0f} % came true of "
        f"{whole_text(row['forecasts'])}"
        for row in table.to_dict("records")
    ]
    return ReleaseChart(
        name="reliability",
        title=title,
        reading="Each point: all chances of about that size, their number beside it; on the dashed line they "
        "are right. Grey: 90 % band if each seat and party counted once and on its own; seats move "
        "together, so that right chances leave it more often.",
        alt_text=_said(f"{title} {'; '.join(parts)}.", contents),
        draw=lambda layout: build_reliability_chart(table, layout=layout),
    )


def _staleness_chart(contents: ReportContents) -> ReleaseChart:
    table = contents.staleness
    rows = table[(table["code"] == "") & (table["level"] == Level.PARTY)]
    title = "How wrong polls and estimates were, by their age on polling day"
    parts = [
        f"{row['days_from']:.0f} to {row['days_to']:.0f} days: "
        + ", ".join(
            f"{name} {share_text(row[column], unit=False)}"
            for name, column in (
                ("polls", "poll_error"),
                ("formula", "expected_error"),
                ("model", "estimate_error"),
            )
            if not pd.isna(row[column])
        )
        for row in rows.to_dict("records")
    ]
    return ReleaseChart(
        name="measured_staleness",
        title=title,
        reading="Root mean square error over parties, in points. Full lines: measured against the result; "
        "dashed: what "
        "the shelf-life formula expects of a poll of 1,000, and what the estimates said of themselves.",
        alt_text=_said(f"{title}. {'; '.join(parts)}.", contents),
        draw=lambda layout: build_staleness_chart(rows, layout=layout),
    )
