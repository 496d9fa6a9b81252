"""What was said of polling day on each replayed date, with the result: one panel per party."""

from __future__ import annotations

from collections.abc import Sequence

import altair as alt
import numpy as np
import pandas as pd

from aggregator.release.chart_style import INK, CodeLook, Layout

RESULT_DASH = (5, 3)
_AXIS_ROOM = 32
"""Pixels for the numbers left of a panel."""


def build_history_chart(
    rows: pd.DataFrame, *, looks: Sequence[CodeLook], unit: str, decimals: int, layout: Layout
) -> alt.ConcatChart:
    """Draw mean and 90 % band of every replayed date, and the result as a dashed line.

    Panels have axes of their own: a small party's errors would not show on a large one's.

    Parameters
    ----------
    rows
        This program's rows of ``scores.csv`` for one quantity in the country.
    looks
        The codes to draw, and how.
    unit
        For the numbers in a panel's title.
    decimals
        Of the result in a panel's title.
    """
    columns = 3 if layout.long_names else 2
    width = (layout.width - _AXIS_ROOM * columns) // columns - (24 if layout.long_names else 12)
    panels = [
        _panel(rows[rows["code"] == look.code], look, unit, decimals, width, layout)
        for look in looks
        if (rows["code"] == look.code).any()
    ]
    spacing = {
        "row": 66 if layout.long_names else 54,
        "column": _AXIS_ROOM + (18 if layout.long_names else 10),
    }
    return alt.concat(*panels, columns=columns, spacing=spacing, bounds="flush").resolve_scale(
        y="independent"
    )


def _panel(
    rows: pd.DataFrame, look: CodeLook, unit: str, decimals: int, width: int, layout: Layout
) -> alt.LayerChart | alt.FacetChart:
    drawn = rows[["as_of", "estimate", "low_90", "high_90", "truth"]].rename(columns={"as_of": "date"})
    low, high = float(drawn[["low_90", "truth"]].min().min()), float(drawn[["high_90", "truth"]].max().max())
    room = max(0.08 * (high - low), 10.0**-decimals)
    scale = alt.Scale(domain=[max(low - room, 0.0), high + room], nice=False)
    span = (drawn["date"].max() - drawn["date"].min()).days
    x = alt.X(
        "date:T",
        title=None,
        axis=alt.Axis(
            grid=False,
            format="%b %Y" if span > 200 else "%-d %b",
            labelFontSize=layout.font_size - 1,
            labelFlush=True,
            values=_few_days(drawn["date"], 3 if layout.long_names else 2),
        ),
    )
    fine = high - low < 4 and decimals > 0
    axis = alt.Axis(
        title=None, ticks=False, domain=False, tickCount=4, tickMinStep=0.1 if fine else 1,
        format=".1f" if fine else "d", labelFontSize=layout.font_size - 1,
    )  # fmt: skip

    def y(field: str) -> alt.Y:
        return alt.Y(f"{field}:Q", scale=scale, axis=axis)

    base = alt.Chart(drawn).encode(x=x)
    result = float(drawn["truth"].iloc[0])
    name = look.name if layout.long_names else look.code
    title = alt.TitleParams(
        f"{name}: {result:.{decimals}f}{unit}" if not layout.long_names else f"{name}: result "
        f"{result:.{decimals}f}{unit}",
        anchor="start", frame="group", fontSize=layout.font_size, fontWeight=600, color=INK, offset=6,
        limit=width + 30,
    )  # fmt: skip
    return alt.layer(
        base.mark_area(opacity=0.2, color=look.colour).encode(y=y("low_90"), y2=alt.Y2("high_90:Q")),
        base.mark_line(strokeWidth=2.2, color=look.colour, point=False).encode(y=y("estimate")),
        base.mark_point(size=14, filled=True, opacity=1, color=look.colour, shape=look.shape).encode(
            y=y("estimate")
        ),
        base.mark_line(strokeWidth=1.4, strokeDash=list(RESULT_DASH), color=INK).encode(y=y("truth")),
        title=title,
    ).properties(width=width, height=150 if layout.long_names else 105)


def _few_days(dates: pd.Series, most: int) -> list[alt.DateTime]:
    days = sorted(pd.DatetimeIndex(dates.unique()))
    places = np.unique(np.linspace(0, len(days) - 1, most).round().astype(int))
    if most == 2:
        places = places[[0, -1]] if len(places) > 1 else places
    return [alt.DateTime(year=days[i].year, month=days[i].month, date=days[i].day) for i in places]
