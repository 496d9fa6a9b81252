"""Combinations of parties: who is in each, how many seats they hold together, and the majority line."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import altair as alt
import numpy as np
import pandas as pd

from aggregator.release.chamber import Chamber
from aggregator.release.chart_style import GRID, INK, MUTED, CodeLook, Layout, colour_of, shape_of
from aggregator.release.combination_words import members_of
from aggregator.release.rounding import chance_text

ROW = 27
"""Pixels from one row to the next."""


@dataclass(frozen=True)
class _Places:
    """Where things stand across: the scale of the seats, and in its own unit all that stands beside it.

    A scale that runs on beyond its ends puts the marks of the parties left of the seats, without a second
    scale that the layers would have to keep apart.
    """

    columns: Mapping[str, float]
    x: Mapping[str, object]
    width: int

    def at(self, field: str) -> alt.X:
        return alt.X(f"{field}:Q", **self.x)  # type: ignore[arg-type]


def build_combinations_chart(
    rows: pd.DataFrame, *, looks: Mapping[str, CodeLook], chamber: Chamber, layout: Layout
) -> alt.LayerChart | alt.FacetChart:
    """Draw one row per combination: its parties marked, its seats with their interval, its chance.

    Parameters
    ----------
    rows
        Rows of ``combinations.csv`` of one day, in the order wanted.
    looks
        How each code is drawn, in the contest's order.
    chamber
        Gives the majority line.
    """
    names = list(rows["combination"])
    members = {code for name in names for code in members_of(name)}
    shown = [look for look in looks.values() if look.code in members]
    places = _places(rows, shown, chamber, layout)
    y = alt.Y("combination:N", sort=names, title=None, axis=None)
    return alt.layer(
        *_line_layers(chamber, places, layout),
        *_member_layers(rows, shown, places, y),
        *_header_layers(shown, places, layout),
        *_seats_layers(rows, places, y, layout),
    ).properties(width=places.width, height=ROW * len(rows))


def _places(rows: pd.DataFrame, shown: list[CodeLook], chamber: Chamber, layout: Layout) -> _Places:
    chance_room, gap = (70, 30) if layout.long_names else (46, 16)
    width = layout.width - 30
    step = min(46 if layout.long_names else 25, 0.45 * width / max(len(shown), 1))
    first, last = step * len(shown) + gap, width - chance_room
    low, high = _domain(rows, chamber)
    per_pixel = (high - low) / (last - first)
    return _Places(
        columns={
            look.code: low + (step * (place + 0.5) - first) * per_pixel for place, look in enumerate(shown)
        },
        x={
            "scale": alt.Scale(domain=[low, high], range=[first, last], nice=False, zero=False),
            "axis": alt.Axis(
                title="seats",
                ticks=False,
                domain=False,
                tickCount=6 if layout.long_names else 4,
                labelFlush=False,
            ),
        },
        width=width,
    )


def _domain(rows: pd.DataFrame, chamber: Chamber) -> tuple[float, float]:
    low = min(float(rows["q05"].min()), float(chamber.line[0]))
    high = max(float(rows["q95"].max()), float(chamber.line[1]))
    room = max(0.04 * (high - low), 1.0)
    return max(float(np.floor(low - room)), 0.0), float(np.ceil(high + room))


def _member_layers(rows: pd.DataFrame, shown: list[CodeLook], places: _Places, y: alt.Y) -> list[alt.Chart]:
    """A mark for every member, a faint dot for every other party, and a thread through the members."""
    cells, threads = [], []
    for name in rows["combination"]:
        of = members_of(name)
        cells += [
            {"combination": name, "code": code, "place": place, "member": code in of}
            for code, place in places.columns.items()
        ]
        ends = [places.columns[code] for code in of]
        threads.append({"combination": name, "place": min(ends), "until": max(ends)})
    table = pd.DataFrame(cells)
    absent = alt.Chart(table[~table["member"]][["combination", "place"]])
    present = alt.Chart(table[table["member"]][["combination", "code", "place"]])
    thread = alt.Chart(pd.DataFrame(threads)).mark_rule(color=MUTED, strokeWidth=1)
    x = places.at("place")
    return [
        absent.mark_circle(size=14, color=GRID, opacity=1).encode(x=x, y=y),
        thread.encode(x=x, x2="until:Q", y=y),
        present.mark_point(size=86, filled=True, opacity=1, stroke="white", strokeWidth=0.8).encode(
            x=x, y=y, color=colour_of(shown), shape=shape_of(shown)
        ),
    ]


def _header_layers(shown: list[CodeLook], places: _Places, layout: Layout) -> list[alt.Chart]:
    """Codes above their marks, and what the numbers at the right are."""
    heads = pd.DataFrame([{"place": places.columns[look.code], "label": look.code} for look in shown])
    size = layout.font_size - 1
    codes = alt.Chart(heads).mark_text(baseline="bottom", dy=-4, color=INK, fontSize=size)
    right = alt.Chart(pd.DataFrame({"label": ["chance"]})).mark_text(
        align="right", baseline="bottom", dy=-4, color=MUTED, fontSize=size
    )
    top = alt.YValue(0)
    return [
        codes.encode(x=places.at("place"), y=top, text="label:N"),
        right.encode(x=alt.XValue(places.width), y=top, text="label:N"),
    ]


def _line_layers(chamber: Chamber, places: _Places, layout: Layout) -> list[alt.Chart]:
    line = {
        "line": [float(chamber.middle_line)],
        "low": [float(chamber.line[0])],
        "high": [float(chamber.line[1])],
        "label": [chamber.line_text],
    }
    base = alt.Chart(pd.DataFrame(line))
    text = base.mark_text(baseline="bottom", dy=-4, color=INK, fontSize=layout.font_size - 1)
    moving = base.mark_rect(color=MUTED, opacity=0.16).encode(x=places.at("low"), x2="high:Q")
    return [
        *([moving] if chamber.line_moves else []),
        base.mark_rule(color=INK, strokeWidth=1.2).encode(x=places.at("line")),
        text.encode(x=places.at("line"), y=alt.YValue(0), text="label:N"),
    ]


def _seats_layers(rows: pd.DataFrame, places: _Places, y: alt.Y, layout: Layout) -> list[alt.Chart]:
    table = rows[["combination", "mean", "q05", "q95"]].assign(
        label=[chance_text(chance) for chance in rows["chance"]]
    )
    base = alt.Chart(table).encode(y=y)
    return [
        base.mark_rule(color=INK, strokeWidth=2).encode(x=places.at("q05"), x2="q95:Q"),
        base.mark_point(size=50, filled=True, opacity=1, color=INK, stroke="white", strokeWidth=0.8).encode(
            x=places.at("mean")
        ),
        base.mark_text(align="right", color=INK, fontSize=layout.font_size).encode(
            x=alt.XValue(places.width), text="label:N"
        ),
    ]
