"""Charts of dots with intervals: house effects, and seats on polling day."""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from typing import Any

import altair as alt
import numpy as np
import pandas as pd

from aggregator.release.chamber import Chamber
from aggregator.release.chart_style import INK, MUTED, CodeLook, Layout, colour_of, shape_of
from aggregator.release.rounding import whole_text
from aggregator.release.table_words import Kind, Level

ROW = 24
"""Pixels from one row to the next."""
TALL_ROW = 32
"""The same where a label has two lines."""
LINE_BREAK = " · "
"""Where a label is broken: an era's house and label are joined so."""


def build_houses_chart(houses: pd.DataFrame, *, looks: Sequence[CodeLook], layout: Layout) -> alt.ConcatChart:
    """One panel per party; in each, a dot and a 90 % interval per way of working of a house.

    Houses are in alphabetical order, the ways of working of one house in the order of their last polls.

    Parameters
    ----------
    houses
        Rows of ``houses.csv``.
    looks
        The parties to draw, and how.
    """
    houses = houses.assign(
        name=[_two_lines(*era) for era in zip(houses["house"], houses["method"], strict=True)]
    )
    names = list(dict.fromkeys(houses["name"]))
    reach = float(np.ceil(max(houses["q95"].max(), -houses["q05"].min(), 1.0)))
    across = 4 if layout.long_names else 2
    across = min(across, len(looks))
    two_lines = any(LINE_BREAK in name for name in names)
    label_room = (200 if two_lines else 170) if layout.long_names else 112
    width = (layout.width - label_room - 24 * across) // across
    panels = [
        _house_panel(
            houses[houses["code"] == look.code],
            look=look,
            looks=looks,
            names=names,
            reach=reach,
            width=width,
            first=place % across == 0,
            label_room=label_room,
            layout=layout,
        )
        for place, look in enumerate(looks)
    ]
    return alt.concat(*panels, columns=across, spacing=18)


def _house_panel(
    rows: pd.DataFrame,
    *,
    look: CodeLook,
    looks: Sequence[CodeLook],
    names: Sequence[str],
    reach: float,
    width: int,
    first: bool,
    label_room: int,
    layout: Layout,
) -> alt.LayerChart | alt.FacetChart:
    rows = rows[["name", "house", "method", "code", "lean", "q05", "q95", "polls"]]
    y = alt.Y(
        "name:N",
        sort=list(names),
        title=None,
        axis=alt.Axis(
            labels=first,
            ticks=False,
            domain=False,
            grid=True,
            labelLimit=label_room - 8,
            labelExpr=f"split(datum.label, '{LINE_BREAK}')",
            labelLineHeight=layout.font_size + 1,
            labelOffset={
                "condition": {
                    "test": f"indexof(datum.label, '{LINE_BREAK}') > 0",
                    "value": -layout.font_size / 2,
                },
                "value": 0,
            },
            labelColor=INK,
            labelPadding=6,
        ),
    )
    x_axis = alt.Axis(
        title="points",
        values=_round_ticks(reach),
        grid=False,
        labelExpr="datum.value == 0 ? '0' : format(datum.value, '+d')",
        labelFontSize=layout.font_size - 1,
    )
    scale = alt.Scale(domain=[-reach, reach], nice=False)
    zero = (
        alt.Chart(pd.DataFrame({"zero": [0.0]}))
        .mark_rule(color=MUTED)
        .encode(x=alt.X("zero:Q", scale=scale, axis=x_axis))
    )
    base = alt.Chart(rows).encode(y=y, color=colour_of(looks))
    interval = base.mark_rule(strokeWidth=2).encode(
        x=alt.X("q05:Q", scale=scale, axis=x_axis), x2=alt.X2("q95:Q")
    )
    dot = base.mark_point(size=58, filled=True, opacity=1, stroke="white", strokeWidth=0.8).encode(
        x=alt.X("lean:Q", scale=scale, axis=x_axis), shape=shape_of(looks)
    )
    title = alt.TitleParams(
        text=look.name,
        anchor="start",
        frame="group",
        fontSize=layout.font_size,
        fontWeight=600,
        color=INK,
        limit=width,
        offset=6,
    )
    row = TALL_ROW if any(LINE_BREAK in name for name in names) else ROW
    return alt.layer(zero, interval, dot).properties(width=width, height=row * len(names), title=title)


def _two_lines(house: str, method: str) -> str:
    return f"{house}{LINE_BREAK}{method}" if method else house


def _round_ticks(reach: float) -> list[float]:
    step = 1 if reach <= 2 else 2 if reach <= 5 else 5
    half = list(np.arange(step, reach + 1e-9, step))
    return [-tick for tick in reversed(half)] + [0.0, *half]


def build_seats_chart(
    seats: pd.DataFrame, *, looks: Sequence[CodeLook], chamber: Chamber, layout: Layout
) -> alt.LayerChart | alt.FacetChart:
    """Seats on polling day: parties first, largest at the top, alliances below, with the majority line.

    Parameters
    ----------
    seats
        Rows of ``seats.csv``.
    looks
        The codes to draw, and how.
    chamber
        The chamber and its majority line.
    """
    rows = seats[(seats["kind"] == Kind.ON_POLLING_DAY) & seats["code"].isin([look.code for look in looks])]
    names = {look.code: look.name for look in looks}
    rows = rows.assign(
        alliance=rows["level"] == Level.ALLIANCE,
        name=rows["code"].map(names),
        label=[_mean_and_interval(row) for row in rows.to_dict("records")],
    ).sort_values(["alliance", "mean"], ascending=[True, False], kind="stable")
    number_room = 100 if layout.long_names else 84
    name_room = 180 if layout.long_names else 112
    width = layout.width - number_room - name_room - 20
    top = max(float(rows["q95"].max()), chamber.line[1] * 1.05)
    scale = alt.Scale(domain=[0, min(top * 1.02, chamber.size[1])], nice=False)
    axis = alt.Axis(title="seats", grid=True, ticks=False, tickCount=6, domain=False, labelFlush=False)
    below_parties = alt.YValue((ROW + 10) * int((~rows["alliance"]).sum()))
    base = alt.Chart(rows[["name", "code", "mean", "q05", "q25", "q75", "q95", "label"]]).encode(
        y=alt.Y(
            "name:N",
            sort=list(rows["name"]),
            title=None,
            axis=alt.Axis(
                ticks=False, domain=False, labelColor=INK, labelPadding=8, labelLimit=name_room - 10
            ),
        ),
        color=colour_of(looks),
    )
    majority = {"majority": [float(chamber.middle_line)], "label": [chamber.line_text]}
    line = alt.Chart(
        pd.DataFrame(majority | {"low": [float(chamber.line[0])], "high": [float(chamber.line[1])]})
    )
    moving = line.mark_rect(color=MUTED, opacity=0.16).encode(
        x=alt.X("low:Q", scale=scale, axis=axis), x2="high:Q"
    )
    return alt.layer(
        *([moving] if chamber.line_moves else []),
        alt.Chart(rows[rows["alliance"]][["code"]].head(1))
        .mark_rule(color=MUTED, strokeWidth=0.8, strokeDash=[2, 3])
        .encode(y=below_parties, x=alt.XValue(0), x2=alt.X2Value(width)),
        line.mark_rule(color=INK, strokeWidth=1.2).encode(x=alt.X("majority:Q", scale=scale, axis=axis)),
        line.mark_text(
            baseline="bottom", align="right", dx=4, dy=-4, color=INK, fontSize=layout.font_size
        ).encode(x=alt.X("majority:Q", scale=scale, axis=axis), y=alt.YValue(0), text="label:N"),
        base.mark_rule(strokeWidth=1.6).encode(x=alt.X("q05:Q", scale=scale, axis=axis), x2=alt.X2("q95:Q")),
        base.mark_rule(strokeWidth=8, opacity=0.55).encode(
            x=alt.X("q25:Q", scale=scale, axis=axis), x2=alt.X2("q75:Q")
        ),
        base.mark_point(size=70, filled=True, opacity=1, stroke="white", strokeWidth=1).encode(
            x=alt.X("mean:Q", scale=scale, axis=axis), shape=shape_of(looks)
        ),
        base.mark_text(align="left", fontSize=layout.font_size).encode(
            x=alt.XValue(width + 10), text="label:N", color=alt.ColorValue(INK)
        ),
    ).properties(width=width, height=(ROW + 10) * len(rows))


def _mean_and_interval(row: dict[Hashable, Any]) -> str:
    return f"{whole_text(row['mean'])} ({whole_text(row['q05'])} to {whole_text(row['q95'])})"
