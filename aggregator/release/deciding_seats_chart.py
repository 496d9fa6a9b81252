"""The seats that decide a majority: one panel per party or alliance, the likeliest seats in each."""

from __future__ import annotations

from collections.abc import Sequence

import altair as alt
import pandas as pd

from aggregator.release.chart_style import INK, CodeLook, Layout, colour_of
from aggregator.release.rounding import chance_text
from aggregator.release.seats_rows import seat_name

ROW = 24
"""Pixels from one row to the next."""
GAP = 28
PERCENT = 100.0


def build_deciding_seats_chart(
    panels: Sequence[tuple[CodeLook, pd.DataFrame]], *, layout: Layout
) -> alt.ConcatChart:
    """Draw a bar per seat: how often it decides; beside it the chance of winning it.

    Parameters
    ----------
    panels
        Each code's look, and rows of ``deciding_seats.csv`` in the order wanted.
    """
    across = 2 if layout.long_names and len(panels) > 1 else 1
    width = (layout.width - 30 - GAP * (across - 1)) // across
    reach = max(float(rows["decides"].max()) for _, rows in panels) * PERCENT * 1.02
    looks = [look for look, _ in panels]
    drawn = [
        _panel(look, rows, looks=looks, reach=reach, width=width, layout=layout) for look, rows in panels
    ]
    return alt.concat(*drawn, columns=across, spacing=GAP)


def _panel(
    look: CodeLook,
    rows: pd.DataFrame,
    *,
    looks: Sequence[CodeLook],
    reach: float,
    width: int,
    layout: Layout,
) -> alt.LayerChart | alt.FacetChart:
    name_room, number_room = (140, 88) if layout.long_names else (112, 72)
    # Two seats may bear one name: rows are told apart by the seat's code, and show its name.
    table = pd.DataFrame(
        {
            "seat": rows["seat"],
            "name": [seat_name(row) for row in rows.to_dict("records")],
            "code": rows["code"],
            "decides": PERCENT * rows["decides"],
            "label": [f"wins it: {chance_text(chance)}" for chance in rows["chance"]],
        }
    )
    base = alt.Chart(table).encode(y=alt.Y("seat:N", sort=list(table["seat"]), title=None, axis=None))
    x = alt.X(
        "decides:Q",
        scale=alt.Scale(domain=[0, reach], range=[name_room, width - number_room], nice=False),
        axis=alt.Axis(
            title="percent of the draws in which it decides",
            titleX=name_room,
            titleAlign="left",
            ticks=False,
            domain=False,
            tickCount=4,
            labelFlush=False,
        ),
    )
    size = layout.font_size
    title = alt.TitleParams(
        text=look.name, anchor="start", frame="group", fontSize=size, fontWeight=600, color=INK, offset=6
    )
    return alt.layer(
        base.mark_bar(height=ROW * 0.5).encode(x=x, color=colour_of(looks)),
        base.mark_text(align="right", fontSize=size, color=INK, limit=name_room - 8).encode(
            x=alt.XValue(name_room - 8), text="name:N"
        ),
        base.mark_text(align="right", fontSize=size - 1, color=INK).encode(
            x=alt.XValue(width), text="label:N"
        ),
    ).properties(width=width, height=ROW * len(table), title=title)
