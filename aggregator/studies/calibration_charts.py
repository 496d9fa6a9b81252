"""The charts of a calibration: intervals that hold the truth, places of the truth, chances that come true."""

from __future__ import annotations

import altair as alt
import numpy as np
import pandas as pd

from aggregator.release.chart_style import GRID, INK, MUTED, Layout
from aggregator.release.charts import ReleaseChart
from aggregator.replays.calibration_charts import build_reliability_chart
from aggregator.studies.calibration_report import CalibrationReport
from aggregator.studies.places import FALSE_ALARM
from aggregator.studies.uniformity import curves_of_places

COLOUR = "#2f5d62"
PLACES_HEIGHT = 90
# By whether names are written out: pixels for the labels of rows, and for a row.
LABEL_ROOM, COVERAGE_ROW = {True: 300, False: 150}, {True: 22, False: 34}
PANEL_TITLES = 40


def build_charts(report: CalibrationReport) -> tuple[ReleaseChart, ...]:
    """Every chart of a calibration's page."""
    charts = [_coverage(report), _places(report)]
    if not report.reliability.empty:
        charts.append(_reliability(report))
    return tuple(charts)


def _coverage(report: CalibrationReport) -> ReleaseChart:
    # Intervals of whole numbers hold more than they state: seats are judged by their places.
    rows = report.coverage[report.coverage["group"] != "seats"]
    said = [
        f"{row['group']}, {row['stated']} % intervals: {row['inside']:.1f} %"
        + (f" ({row['low']:.1f} to {row['high']:.1f})" if not np.isnan(row["low"]) else "")
        for row in rows.to_dict("records")
    ]
    return ReleaseChart(
        name="coverage",
        title="How often intervals hold the truth",
        reading="Dot: percent of the intervals that hold it; bar: 95 % interval of that, drawing whole "
        "elections again. Line: what the intervals say of themselves.",
        alt_text="; ".join(said) + ".",
        draw=lambda layout: build_coverage_chart(rows, layout=layout),
    )


def build_coverage_chart(coverage: pd.DataFrame, *, layout: Layout) -> alt.ConcatChart:
    """One panel per stated percentage, one row per group.

    Parameters
    ----------
    coverage
        As :func:`aggregator.studies.coverage.summarise_coverage` gives it.
    """
    stated = list(dict.fromkeys(coverage["stated"]))
    across = len(stated) if layout.long_names else 1
    room = LABEL_ROOM[layout.long_names]
    width = (layout.width - room - 40 - 18 * (across - 1)) // across
    groups = list(dict.fromkeys(coverage["group"]))
    panels = []
    for place, percent in enumerate(stated):
        first = place % across == 0
        rows = coverage[coverage["stated"] == percent].assign(group=lambda t: t["group"].astype(str))
        y = alt.Y(
            "group:N",
            sort=groups,
            title=None,
            axis=alt.Axis(
                labels=first,
                ticks=False,
                domain=False,
                grid=True,
                labelLimit=room - 8,
                labelColor=INK,
                labelExpr="datum.label" if layout.long_names else "split(datum.label, ', ')",
                labelLineHeight=layout.font_size + 1,
                labelOffset=0 if layout.long_names else -layout.font_size / 2,
            ),
        )
        low, high = min(rows["low"].min(), rows["inside"].min(), percent - 10), 100.0
        scale = alt.Scale(domain=[max(low, 0.0), high], nice=False)
        x_axis = alt.Axis(grid=False, tickCount=3)
        x = alt.X("inside:Q", title=None, scale=scale, axis=x_axis)
        base = alt.Chart(rows).encode(y=y)
        said = alt.Chart(pd.DataFrame({"stated": [float(percent)]}))
        panels.append(
            alt.layer(
                said.mark_rule(color=MUTED).encode(x=alt.X("stated:Q", scale=scale, axis=x_axis)),
                base.mark_rule(color=COLOUR, strokeWidth=2).encode(
                    x=alt.X("low:Q", title=None, scale=scale, axis=x_axis), x2=alt.X2("high:Q")
                ),
                base.mark_point(color=COLOUR, filled=True, opacity=1, size=55).encode(x=x),
            ).properties(
                width=width,
                height=COVERAGE_ROW[layout.long_names] * len(groups),
                title=_panel_title(f"{percent} %", layout),
            )
        )
    return alt.concat(*panels, columns=across, spacing=18)


def _places(report: CalibrationReport) -> ReleaseChart:
    judged = report.uniformity
    outside = judged[~judged["inside"]]
    words = "; ".join(f"{row['kind']}, {row['code']}" for row in outside.to_dict("records")) or "none"
    return ReleaseChart(
        name="places",
        title="Where the truth lies among the draws",
        reading="Share of truths at or below each place, less the place. Grey: where all curves of one kind "
        f"stay together in {1 - FALSE_ALARM:.0%} of studies if every interval is right.",
        alt_text=f"{len(judged)} curves, one per kind of number and party; outside their band: {words}.",
        draw=lambda layout: build_places_chart(report.places, layout=layout),
    )


def build_places_chart(kinds: dict[str, pd.DataFrame], *, layout: Layout) -> alt.ConcatChart:
    """One small panel per kind and party, each with its simultaneous band.

    Parameters
    ----------
    kinds
        As :func:`aggregator.studies.places.gather_places` gives them.
    """
    across = 4 if layout.long_names else 2
    width = (layout.width - 30 - across * 42) // across
    panels = []
    for kind, places in kinds.items():
        curves = curves_of_places(places, false_alarm=FALSE_ALARM)
        reach = float(curves[["away", "low", "high"]].abs().to_numpy().max()) * 1.05
        for code, rows in curves.groupby("quantity", sort=False):
            title = kind if places.shape[1] == 1 else f"{kind}, {code}"
            panels.append(_places_panel(rows, title=title, reach=reach, width=width, layout=layout))
    return alt.concat(*panels, columns=across, spacing=12)


def _places_panel(
    rows: pd.DataFrame, *, title: str, reach: float, width: int, layout: Layout
) -> alt.LayerChart | alt.FacetChart:
    x = alt.X("place:Q", title=None, axis=alt.Axis(values=[0, 0.5, 1], format=".1~f", grid=False))
    scale = alt.Scale(domain=[-reach, reach], nice=False)
    y_axis = alt.Axis(grid=False, tickCount=3, format="+.1~f")
    low = alt.Y("low:Q", title=None, scale=scale, axis=y_axis)
    return alt.layer(
        alt.Chart(rows).mark_area(color=GRID, interpolate="step-after").encode(x=x, y=low, y2="high:Q"),
        alt.Chart(pd.DataFrame({"even": [0.0]}))
        .mark_rule(color=MUTED, strokeWidth=0.5)
        .encode(y=alt.Y("even:Q", scale=scale, axis=y_axis)),
        alt.Chart(rows)
        .mark_line(color=COLOUR, interpolate="step-after", strokeWidth=1.5)
        .encode(x=x, y=alt.Y("away:Q", title=None, scale=scale, axis=y_axis)),
    ).properties(width=width, height=PLACES_HEIGHT, title=_panel_title(title, layout))


def _reliability(report: CalibrationReport) -> ReleaseChart:
    rows = report.reliability
    said = [
        f"of {row['forecasts']} chances of {row['chance_from']:g} to {row['chance_to']:g} came true "
        f"{row['share_won']:.0%}"
        for row in rows.to_dict("records")
    ]
    return ReleaseChart(
        name="chances",
        title="How often chances of seats come true",
        reading="Dot: share that came true, against the mean chance. Grey: 90 % band if all seats were "
        "independent; seats of one election move together, so that dots may leave it more often.",
        alt_text="; ".join(said) + ".",
        draw=lambda layout: build_reliability_chart(rows, layout=layout),
    )


def _panel_title(text: str, layout: Layout) -> alt.TitleParams:
    return alt.TitleParams(
        text=_lines(text, most=PANEL_TITLES if layout.long_names else 26),
        anchor="start",
        frame="group",
        fontSize=layout.font_size - 1,
        fontWeight=600,
        color=INK,
        offset=6,
    )


def _lines(text: str, *, most: int) -> list[str]:
    """Break a panel's title at its commas where it is too long."""
    if len(text) <= most:
        return [text]
    head, _, tail = text.rpartition(", ")
    return [f"{head},", tail] if head else [text]
