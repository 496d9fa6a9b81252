"""How wrong a poll is by its age on polling day: the formula, single polls, and the pooled estimate."""

from __future__ import annotations

from dataclasses import dataclass

import altair as alt
import numpy as np
import pandas as pd

from aggregator.release.chart_style import Layout
from aggregator.release.label_placing import spread_labels

LONGEST = 365
"""Days shown; older bands are in the table."""


@dataclass(frozen=True)
class _Curve:
    """One column, how it is drawn, and its label, long and short."""

    column: str
    colour: str
    dash: tuple[int, int]
    measured: bool
    label: str
    short: str


CURVES = (
    _Curve("poll_error", "#a65e2e", (1, 0), True, "single polls, measured", "polls"),
    _Curve("expected_error", "#a65e2e", (6, 4), False, "a poll of 1,000, formula", "formula"),
    _Curve("estimate_error", "#2f5d62", (1, 0), True, "this model, measured", "model"),
    _Curve("estimate_expected", "#2f5d62", (6, 4), False, "this model, as it said", "as said"),
)


def build_staleness_chart(staleness: pd.DataFrame, *, layout: Layout) -> alt.LayerChart | alt.FacetChart:
    """Draw measured and expected errors by days before polling day.

    Parameters
    ----------
    staleness
        Rows of ``staleness.csv`` for one code.
    """
    rows = staleness[staleness["days_to"] <= LONGEST]
    rows = rows.assign(days=(rows["days_from"] + rows["days_to"]) / 2)
    width = layout.width - (246 if layout.long_names else 108)
    height = 320 if layout.long_names else 250
    columns = [curve.column for curve in CURVES]
    top = max(float(np.nanmax(rows[columns].to_numpy(float))) * 1.08, 0.1)
    x = alt.X(
        "days:Q",
        title="days from fieldwork, or from the estimate, to polling day",
        scale=alt.Scale(domain=[0, float(rows["days_to"].max())], nice=False),
        axis=alt.Axis(grid=False, tickCount=width // 60, labelFlush=False),
    )
    axis = alt.Axis(
        title="root mean square error, points", titleAngle=0, titleAlign="left", titleAnchor="start",
        titleX=0, titleY=-12, ticks=False, domain=False, tickCount=5,
    )  # fmt: skip
    y = alt.Y("error:Q", scale=alt.Scale(domain=[0, top], nice=False), axis=axis)
    drawn = [
        (curve, rows[["days", curve.column]].rename(columns={curve.column: "error"}).dropna())
        for curve in CURVES
    ]
    drawn = [(curve, line) for curve, line in drawn if len(line)]
    ends = [float(line["error"].iloc[-1]) for _, line in drawn]
    placed = spread_labels(ends, gap=1.5 * layout.font_size * top / height, low=0.0, high=top)
    layers: list[alt.Chart] = []
    for (curve, line), place in zip(drawn, placed, strict=True):
        base = alt.Chart(line).encode(x=x, y=y)
        layers.append(base.mark_line(strokeWidth=2.4, strokeDash=list(curve.dash), color=curve.colour))
        if curve.measured:
            layers.append(
                base.mark_point(size=42, filled=True, opacity=1, color=curve.colour, stroke="white")
            )
        label = alt.Chart(
            pd.DataFrame({"error": [place], "label": [curve.label if layout.long_names else curve.short]})
        )
        layers.append(
            label.mark_text(
                align="left", baseline="middle", fontSize=layout.font_size, fontWeight=600, color=curve.colour
            ).encode(x=alt.XValue(width + 8), y=y, text="label:N")
        )
    return alt.layer(*layers).properties(width=width, height=height)
