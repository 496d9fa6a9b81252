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
from aggregator.release.table_words import Kind


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
        A level drawn across, such as the majority, and its name.
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
    """Scales shared by all layers, and the sizes that follow from the layout.

    The room right of polling day holds one slot per code, side by side, so that no two intervals overlap.
    """

    x: alt.X
    x_scale: alt.Scale
    y_scale: alt.Scale
    y_axis: alt.Axis
    width: int
    height: int
    low: float
    top: float
    last_day: pd.Timestamp
    slot: pd.Timedelta
    size: int
    label_room: int
    labelled_silence: bool

    def y(self, field: str) -> alt.Y:
        return alt.Y(f"{field}:Q", scale=self.y_scale, axis=self.y_axis)

    def x2(self, value: float) -> alt.X2Value:
        return alt.X2Value(value)


def build_over_time_chart(content: OverTime, *, layout: Layout) -> alt.LayerChart | alt.FacetChart:
    """Draw means with 50 and 90 % bands, polls, and polling-day intervals with their labels."""
    codes = [look.code for look in content.looks]
    rows = content.rows[content.rows["code"].isin(codes)]
    dated = rows[rows["kind"] == Kind.ON_DATE]
    final = rows[rows["kind"] == Kind.ON_POLLING_DAY].sort_values("mean", ascending=False, kind="stable")
    canvas = _canvas(content, dated, final, layout)
    layers = [
        *_background_layers(content, canvas),
        *_band_layers(content, canvas, dated),
        *_point_layers(content, canvas),
        *_level_layers(content, canvas),
        *_polling_day_layers(content, canvas, final),
        *_label_layers(content, canvas, final, layout),
    ]
    return alt.layer(*layers).properties(width=canvas.width, height=canvas.height)


def _canvas(content: OverTime, dated: pd.DataFrame, final: pd.DataFrame, layout: Layout) -> _Canvas:
    label_room, slot_width = (236, 10) if layout.long_names else (70, 7)
    width = layout.width - label_room - 40
    drawn = [dated["q05"], dated["q95"], final["q05"], final["q95"]]
    if content.points is not None and len(content.points):
        drawn.append(content.points["value"])
    if content.line_at is not None:
        drawn.append(pd.Series([content.line_at]))
    every = pd.concat(drawn).astype(float)
    step = _round_step(every.max() - _floor_of(every.min(), 10))
    low, top = _floor_of(every.min(), step), float(np.ceil(every.max() * 1.02 / step) * step)
    first = dated["date"].min()
    last_day = max(pd.Timestamp(content.polling_day), pd.Timestamp(content.run_date))
    days_per_pixel = max((last_day - first).days, 1) / (width - slot_width * (len(final) + 1))
    slot = pd.Timedelta(days=days_per_pixel * slot_width)
    domain = [_moment(first), _moment(last_day + slot * (len(final) + 1))]
    x_scale = alt.Scale(domain=domain, nice=False)
    ticks, tick_format = _ticks(first, last_day, most=max(width // 85, 2))
    x_axis = alt.Axis(title=None, format=tick_format, grid=False, values=ticks, labelFlush=False)
    y_axis = alt.Axis(
        title=content.unit,
        titleAngle=0,
        titleAlign="left",
        titleAnchor="start",
        titleX=0,
        titleY=-22,
        values=list(np.arange(low, top + step / 2, step)),
        ticks=False,
        domain=False,
    )
    return _Canvas(
        x=alt.X("date:T", scale=x_scale, axis=x_axis),
        x_scale=x_scale,
        y_scale=alt.Scale(domain=[low, top], nice=False),
        y_axis=y_axis,
        width=width,
        height=(430 if len(final) > 3 else 300) if layout.long_names else (330 if len(final) > 3 else 230),
        low=low,
        top=top,
        last_day=last_day,
        slot=slot,
        size=layout.font_size,
        label_room=label_room,
        labelled_silence=layout.long_names,
    )


def _round_step(reach: float) -> float:
    """Distance of two lines of the grid: about six of them, at round numbers."""
    return next((step for step in (1.0, 2.0, 5.0, 10.0, 20.0, 25.0, 50.0, 100.0) if reach / step <= 8), 200.0)


def _floor_of(lowest: float, step: float) -> float:
    """Where the axis starts: at zero, unless everything drawn is far above it."""
    return 0.0 if lowest < 15 else float(np.floor(lowest / step) * step)


def _ticks(first: pd.Timestamp, last: pd.Timestamp, *, most: int) -> tuple[list[alt.DateTime], str]:
    """Firsts of months where there are enough of them, else weeks; none after the last day."""
    months = pd.date_range(first, last, freq="MS")
    if len(months) < 3:
        weeks = pd.date_range(end=last, start=first, freq="7D")
        return [_moment(day) for day in weeks[:: -(-len(weeks) // most)]], "%-d %b"
    every = next((n for n in (1, 2, 3, 6, 12, 24, 48) if len(months) / n <= most), 96)
    kept = [day for day in months if (day.month - 1) % min(every, 12) == 0]
    return [_moment(day) for day in kept[:: max(every // 12, 1)]], "%b %Y"


def _moment(day: pd.Timestamp) -> alt.DateTime:
    return alt.DateTime(year=day.year, month=day.month, date=day.day, hours=day.hour)


def _background_layers(content: OverTime, canvas: _Canvas) -> list[alt.Chart]:
    """Silence windows, the day of the run, polling day and the room beyond it."""
    run, vote = pd.Timestamp(content.run_date), canvas.last_day
    beyond = alt.Chart(pd.DataFrame({"date": [vote]})).mark_rect(color=GRID, opacity=0.35)
    layers = [beyond.encode(x=canvas.x, x2=canvas.x2(canvas.width))]
    if content.silence:
        windows = pd.DataFrame(
            {
                "date": [pd.Timestamp(window.from_) for window in content.silence],
                "until": [pd.Timestamp(window.until) + pd.Timedelta(days=1) for window in content.silence],
                "label": "silence",
            }
        )
        windows = windows[windows["until"] > content.rows["date"].min()]
        base = alt.Chart(windows)
        # The label stands right of its window, low: there the room beyond polling day is empty.
        text = base.mark_text(
            align="left", baseline="top", angle=270, dx=4, dy=3, fontSize=canvas.size - 2, color=MUTED
        )
        layers.append(base.mark_rect(color=MUTED, opacity=0.22, clip=True).encode(x=canvas.x, x2="until:T"))
        if canvas.labelled_silence:
            end = alt.X("until:T", scale=canvas.x_scale)
            layers.append(text.encode(x=end, y=alt.YValue(canvas.height), text="label:N"))
    for day, label, align in ((run, "this run", "right"), (vote, "polling day", "left")):
        base = alt.Chart(pd.DataFrame({"date": [day], "label": [label]}))
        text = base.mark_text(
            align=align,  # type: ignore[arg-type]
            baseline="bottom",
            dx=-2 if align == "right" else 2,
            dy=-3,
            fontSize=canvas.size - 1,
            color=MUTED,
        )
        layers += [
            base.mark_rule(color=MUTED, strokeDash=[2, 3]).encode(x=canvas.x),
            text.encode(x=canvas.x, y=alt.YValue(0), text="label:N"),
        ]
    return layers


def _band_layers(content: OverTime, canvas: _Canvas, dated: pd.DataFrame) -> list[alt.Chart]:
    base = alt.Chart(dated[["date", "code", "mean", "q05", "q25", "q75", "q95"]]).encode(
        x=canvas.x, color=colour_of(content.looks)
    )
    return [
        base.mark_area(opacity=0.13).encode(y=canvas.y("q05"), y2=alt.Y2("q95:Q")),
        base.mark_area(opacity=0.26).encode(y=canvas.y("q25"), y2=alt.Y2("q75:Q")),
        base.mark_line(strokeWidth=2).encode(y=canvas.y("mean")),
    ]


def _point_layers(content: OverTime, canvas: _Canvas) -> list[alt.Chart]:
    if content.points is None or content.points.empty:
        return []
    mark = alt.Chart(content.points).mark_point(size=13, opacity=0.45, filled=True, clip=True)
    return [
        mark.encode(
            x=canvas.x,
            y=canvas.y("value"),
            color=colour_of(content.looks),
            shape=shape_of(content.looks),
            tooltip=[
                alt.Tooltip("house:N"),
                alt.Tooltip("code:N"),
                alt.Tooltip("value:Q", format=".1f"),
                alt.Tooltip("date:T", format="%-d %b %Y"),
            ],
        )
    ]


def _level_layers(content: OverTime, canvas: _Canvas) -> list[alt.Chart]:
    if content.line_at is None:
        return []
    level = pd.DataFrame({"level": [float(content.line_at)]})
    return [alt.Chart(level).mark_rule(color=INK, strokeWidth=1.2).encode(y=canvas.y("level"))]


def _polling_day_layers(content: OverTime, canvas: _Canvas, final: pd.DataFrame) -> list[alt.Chart]:
    base = alt.Chart(_in_slots(final, canvas)).encode(x=canvas.x, color=colour_of(content.looks))
    return [
        base.mark_rule(strokeWidth=1.5).encode(y=canvas.y("q05"), y2=alt.Y2("q95:Q")),
        base.mark_rule(strokeWidth=5, opacity=0.6).encode(y=canvas.y("q25"), y2=alt.Y2("q75:Q")),
        base.mark_point(size=42, filled=True, opacity=1, stroke="white", strokeWidth=0.8).encode(
            y=canvas.y("mean"), shape=shape_of(content.looks)
        ),
    ]


def _in_slots(final: pd.DataFrame, canvas: _Canvas) -> pd.DataFrame:
    places = [canvas.last_day + canvas.slot * (slot + 0.9) for slot in range(len(final))]
    return final[["code", "mean", "q05", "q25", "q75", "q95"]].assign(date=places)


def _label_layers(content: OverTime, canvas: _Canvas, final: pd.DataFrame, layout: Layout) -> list[alt.Chart]:
    """Name and number of every code, and of the level drawn across, each led to its place."""
    names = {look.code: look.name if layout.long_names else look.code for look in content.looks}
    labels = _in_slots(final, canvas)[["code", "date", "mean"]].assign(
        label=[
            f"{names[code]} {value:.{content.decimals}f}"
            for code, value in zip(final["code"], final["mean"], strict=True)
        ]
    )
    if content.line_at is not None:
        end = canvas.last_day + canvas.slot * (len(final) + 1)
        level = {"code": "", "date": end, "mean": float(content.line_at), "label": content.line_label}
        labels = pd.concat([labels, pd.DataFrame([level])], ignore_index=True)
    gap = (canvas.size + 3) * (canvas.top - canvas.low) / canvas.height
    labels["placed"] = spread_labels(labels["mean"], gap=gap, low=canvas.low + 0.4 * gap, high=canvas.top)
    beyond = canvas.width + 14
    text = alt.Chart(labels).mark_text(
        align="left", baseline="middle", fontSize=canvas.size, color=INK, limit=canvas.label_room
    )
    leaders = []
    for chosen, colour in (
        (labels[labels["code"] != ""], colour_of(content.looks)),
        (labels[labels["code"] == ""], alt.ColorValue(INK)),
    ):
        if len(chosen):
            leader = alt.Chart(chosen).mark_rule(strokeWidth=0.7, opacity=0.8)
            leaders.append(
                leader.encode(
                    x=canvas.x,
                    x2=canvas.x2(beyond - 3),
                    y=canvas.y("mean"),
                    y2="placed:Q",
                    color=colour,
                )
            )
    return [*leaders, text.encode(x=alt.XValue(beyond), y=canvas.y("placed"), text="label:N")]
