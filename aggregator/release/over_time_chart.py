"""Support or seats over time, and on polling day at the right end."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

import altair as alt
import numpy as np
import pandas as pd

from aggregator.inputs.contest import Silence
from aggregator.release.chart_style import GRID, INK, MUTED, CodeLook, Layout, colour_of, shape_of
from aggregator.release.label_placing import spread_labels
from aggregator.release.table_schemas import Kind


@dataclass(frozen=True)
class OverTime:
    """What a chart over time shows.

    Attributes
    ----------
    rows
        Rows of ``support.csv`` (one region) or ``seats.csv``, both kinds.
    looks
        The codes to draw, and how.
    unit
        Title of the vertical axis.
    decimals
        Digits of the numbers in the labels.
    run_date, polling_day
        The two days marked.
    points
        Polls: columns ``date``, ``code``, ``value``, ``house``; None where there are none to show.
    line_at, line_label
        A horizontal line, such as the majority.
    silence
        Windows without publication, marked.
    """

    rows: pd.DataFrame
    looks: Sequence[CodeLook]
    unit: str
    decimals: int
    run_date: date
    polling_day: date
    points: pd.DataFrame | None = None
    line_at: int | None = None
    line_label: str = ""
    silence: Sequence[Silence] = ()


@dataclass(frozen=True)
class _Canvas:
    """Scales shared by all layers, and the sizes that follow from the layout."""

    x: alt.Scale
    y: alt.Scale
    width: int
    height: int
    top: float
    days_per_pixel: float
    size: int


SLOT = 9
"""Pixels between two parties' intervals on polling day."""


def build_over_time_chart(content: OverTime, *, layout: Layout) -> alt.LayerChart:
    """Draw medians with 50 and 90 % bands, polls, and polling-day intervals with their labels."""
    codes = [look.code for look in content.looks]
    rows = content.rows[content.rows["code"].isin(codes)]
    dated = rows[rows["kind"] == Kind.ON_DATE]
    final = rows[rows["kind"] == Kind.ON_POLLING_DAY].sort_values("q50", ascending=False, kind="stable")
    canvas = _canvas(content, dated, final, layout)
    layers: list[alt.Chart] = [
        *_silence_layers(content, canvas),
        *_day_layers(content, canvas),
        *_line_at_layers(content, canvas, dated),
        *_band_layers(content, canvas, dated),
    ]
    if content.points is not None and len(content.points):
        layers.append(_point_layer(content, canvas))
    layers += _polling_day_layers(content, canvas, final, layout)
    return alt.layer(*layers).properties(width=canvas.width, height=canvas.height)


def _canvas(content: OverTime, dated: pd.DataFrame, final: pd.DataFrame, layout: Layout) -> _Canvas:
    label_room = 230 if layout.long_names else 66
    width = layout.width - label_room - 64
    height = 430 if layout.long_names else 330
    highest = max(dated["q95"].max(), final["q95"].max(), content.line_at or 0)
    if content.points is not None and len(content.points):
        highest = max(highest, content.points["value"].max())
    step = 5 if highest < 60 else 10 if highest < 150 else 25
    top = float(np.ceil(highest * 1.03 / step) * step)
    first, last = dated["date"].min(), max(pd.Timestamp(content.polling_day), pd.Timestamp(content.run_date))
    slots = SLOT * (len(final) + 1)
    days_per_pixel = max((last - first).days, 1) / (width - slots)
    domain = [_day(first.date()), _day((last + pd.Timedelta(days=days_per_pixel * slots)).date())]
    return _Canvas(
        alt.Scale(domain=domain, nice=False),
        alt.Scale(domain=[0, top], nice=False),
        width,
        height,
        top,
        days_per_pixel,
        layout.font_size,
    )


def _day(day: date) -> alt.DateTime:
    return alt.DateTime(year=day.year, month=day.month, date=day.day)


def _x(canvas: _Canvas, field: str = "date") -> alt.X:
    axis = alt.Axis(
        title=None, format="%-d %b %y", grid=False, tickCount=max(canvas.width // 110, 2), labelFlush=False
    )
    return alt.X(f"{field}:T", scale=canvas.x, axis=axis)


def _y(content: OverTime, canvas: _Canvas, field: str) -> alt.Y:
    axis = alt.Axis(
        title=content.unit,
        titleAngle=0,
        titleAlign="left",
        titleAnchor="start",
        titleX=0,
        titleY=-10,
        tickCount=6,
        ticks=False,
        domain=False,
    )
    return alt.Y(f"{field}:Q", scale=canvas.y, axis=axis)


def _silence_layers(content: OverTime, canvas: _Canvas) -> list[alt.Chart]:
    if not content.silence:
        return []
    windows = pd.DataFrame(
        {
            "date": [pd.Timestamp(w.from_) for w in content.silence],
            "until": [pd.Timestamp(w.until) + pd.Timedelta(days=1) for w in content.silence],
            "label": "silence",
        }
    )
    base = alt.Chart(windows)
    stretch = base.mark_rect(color=GRID, opacity=0.8).encode(x=_x(canvas), x2="until:T")
    label = base.mark_text(
        align="right", baseline="top", angle=270, dx=-4, dy=2, fontSize=canvas.size - 2, color=MUTED
    ).encode(x=_x(canvas), y=alt.value(0), text="label:N")
    return [stretch, label]


def _day_layers(content: OverTime, canvas: _Canvas) -> list[alt.Chart]:
    marked = {content.run_date: "this run", content.polling_day: "polling day"}
    days = pd.DataFrame({"date": [pd.Timestamp(day) for day in marked], "label": list(marked.values())})
    base = alt.Chart(days)
    rule = base.mark_rule(color=MUTED, strokeDash=[2, 3]).encode(x=_x(canvas))
    label = base.mark_text(
        align="right", baseline="bottom", dx=-2, dy=-3, fontSize=canvas.size - 1, color=MUTED
    ).encode(x=_x(canvas), y=alt.value(0), text="label:N")
    return [rule, label]


def _line_at_layers(content: OverTime, canvas: _Canvas, dated: pd.DataFrame) -> list[alt.Chart]:
    if content.line_at is None:
        return []
    frame = pd.DataFrame(
        {"at": [float(content.line_at)], "date": [dated["date"].min()], "label": [content.line_label]}
    )
    base = alt.Chart(frame)
    rule = base.mark_rule(color=INK, strokeWidth=1.2).encode(y=_y(content, canvas, "at"))
    label = base.mark_text(
        align="left", baseline="bottom", dx=4, dy=-3, fontSize=canvas.size - 1, color=INK
    ).encode(x=_x(canvas), y=_y(content, canvas, "at"), text="label:N")
    return [rule, label]


def _band_layers(content: OverTime, canvas: _Canvas, dated: pd.DataFrame) -> list[alt.Chart]:
    base = alt.Chart(dated[["date", "code", "q05", "q25", "q50", "q75", "q95"]]).encode(
        x=_x(canvas), color=colour_of(content.looks)
    )
    return [
        base.mark_area(opacity=0.13).encode(y=_y(content, canvas, "q05"), y2="q95:Q"),
        base.mark_area(opacity=0.26).encode(y=_y(content, canvas, "q25"), y2="q75:Q"),
        base.mark_line(strokeWidth=2).encode(y=_y(content, canvas, "q50")),
    ]


def _point_layer(content: OverTime, canvas: _Canvas) -> alt.Chart:
    return (
        alt.Chart(content.points)
        .mark_point(size=13, opacity=0.5, filled=True)
        .encode(
            x=_x(canvas),
            y=_y(content, canvas, "value"),
            color=colour_of(content.looks),
            shape=shape_of(content.looks),
            tooltip=[
                "house:N",
                "code:N",
                alt.Tooltip("value:Q", format=".1f"),
                alt.Tooltip("date:T", format="%-d %b %Y"),
            ],
        )
    )


def _polling_day_layers(
    content: OverTime, canvas: _Canvas, final: pd.DataFrame, layout: Layout
) -> list[alt.Chart]:
    names = {look.code: look.name if layout.long_names else look.code for look in content.looks}
    start = max(pd.Timestamp(content.polling_day), pd.Timestamp(content.run_date))
    places = [
        start + pd.Timedelta(days=canvas.days_per_pixel * SLOT * (slot + 0.8)) for slot in range(len(final))
    ]
    gap = (canvas.size + 3) * canvas.top / canvas.height
    frame = final[["code", "q05", "q25", "q50", "q75", "q95"]].assign(
        date=places,
        placed=spread_labels(final["q50"], gap=gap, low=0.4 * gap, high=canvas.top),
        label=[
            f"{names[code]} {value:.{content.decimals}f}"
            for code, value in zip(final["code"], final["q50"], strict=True)
        ],
    )
    base = alt.Chart(frame).encode(x=_x(canvas), color=colour_of(content.looks))
    beyond = canvas.width + 12
    return [
        base.mark_rule(strokeWidth=1.5).encode(y=_y(content, canvas, "q05"), y2="q95:Q"),
        base.mark_rule(strokeWidth=5, opacity=0.75).encode(y=_y(content, canvas, "q25"), y2="q75:Q"),
        base.mark_point(size=34, filled=True, opacity=1, stroke="white", strokeWidth=0.8).encode(
            y=_y(content, canvas, "q50"), shape=shape_of(content.looks)
        ),
        alt.Chart(frame)
        .mark_rule(strokeWidth=0.7, opacity=0.7)
        .encode(
            x=_x(canvas),
            x2=alt.value(beyond - 3),
            y=_y(content, canvas, "q50"),
            y2="placed:Q",
            color=colour_of(content.looks),
        ),
        alt.Chart(frame)
        .mark_text(align="left", baseline="middle", fontSize=canvas.size, color=INK)
        .encode(x=alt.value(beyond), y=_y(content, canvas, "placed"), text="label:N"),
    ]
