"""How the worth of a poll of 1,000 falls with its age."""

from __future__ import annotations

from dataclasses import dataclass

import altair as alt
import pandas as pd

from aggregator.release.chart_style import INK, MUTED, Layout
from aggregator.release.label_placing import spread_labels
from aggregator.release.rounding import whole_text

FULL_WORTH = 1_000
MARKED_AGE = 30


@dataclass(frozen=True)
class _Curve:
    """One of the two statements: its column, how it is drawn, and its label, long and short."""

    column: str
    colour: str
    dash: tuple[int, int]
    label: str
    short: str


CURVES = (
    _Curve("worth_today", "#2f5d62", (1, 0), "on the day of the run", "this run"),
    _Curve("worth_polling_day", "#a65e2e", (6, 4), "as a guide to polling day", "polling day"),
)


def build_worth_chart(shelf_life: pd.DataFrame, *, layout: Layout) -> alt.LayerChart | alt.FacetChart:
    """Draw what a poll of 1,000 is worth by age: for support now, and as a guide to polling day.

    Parameters
    ----------
    shelf_life
        Rows of ``shelf_life.csv`` for one code.
    """
    rows = shelf_life.sort_values("age_days", kind="stable")
    width = layout.width - (246 if layout.long_names else 118)
    height = 320 if layout.long_names else 260
    x = alt.X(
        "age_days:Q",
        title="age of the poll, days",
        scale=alt.Scale(nice=False),
        axis=alt.Axis(grid=False, tickCount=width // 60, labelFlush=False),
    )
    axis = alt.Axis(
        title="respondents it is worth",
        titleAngle=0,
        titleAlign="left",
        titleAnchor="start",
        titleX=0,
        titleY=-12,
        ticks=False,
        domain=False,
        tickCount=5,
    )
    scale = alt.Scale(domain=[0, FULL_WORTH], nice=False)

    def y(field: str) -> alt.Y:
        return alt.Y(f"{field}:Q", scale=scale, axis=axis)

    half = alt.Chart(pd.DataFrame({"worth": [FULL_WORTH / 2], "label": ["half its worth"]}))
    half_text = half.mark_text(
        align="right", baseline="bottom", dy=-3, color=MUTED, fontSize=layout.font_size - 1
    )
    layers: list[alt.Chart] = [
        half.mark_rule(strokeDash=[2, 3], color=MUTED).encode(y=y("worth")),
        half_text.encode(x=alt.XValue(width), y=y("worth"), text="label:N"),
    ]
    ends = [float(rows[curve.column].iloc[-1]) for curve in CURVES]
    gap = 1.5 * layout.font_size * FULL_WORTH / height
    placed = spread_labels(ends, gap=gap, low=0.0, high=FULL_WORTH)
    for curve, place in zip(CURVES, placed, strict=True):
        band = rows[["age_days", curve.column, f"{curve.column}_q05", f"{curve.column}_q95"]].set_axis(
            ["age_days", "worth", "q05", "q95"], axis=1
        )
        base = alt.Chart(band).encode(x=x)
        label = curve.label if layout.long_names else curve.short
        end = alt.Chart(pd.DataFrame({"worth": [place], "label": [label]}))
        end_text = end.mark_text(
            align="left", baseline="middle", fontSize=layout.font_size, fontWeight=600, color=curve.colour
        )
        layers += [
            base.mark_area(opacity=0.16, color=curve.colour).encode(y=y("q05"), y2=alt.Y2("q95:Q")),
            base.mark_line(strokeWidth=2.4, strokeDash=list(curve.dash), color=curve.colour).encode(
                y=y("worth")
            ),
            end_text.encode(x=alt.XValue(width + 8), y=y("worth"), text="label:N"),
        ]
    month = rows[rows["age_days"] == MARKED_AGE][["age_days", "worth_today"]]
    month = month.assign(label=[f"{whole_text(worth)} after a month" for worth in month["worth_today"]])
    mark = alt.Chart(month).encode(x=x, y=y("worth_today"))
    layers += [
        mark.mark_point(size=60, filled=True, opacity=1, color=CURVES[0].colour, stroke="white"),
        mark.mark_text(align="left", dx=8, dy=-9, fontSize=layout.font_size, color=INK).encode(
            text="label:N"
        ),
    ]
    return alt.layer(*layers).properties(width=width, height=height)
