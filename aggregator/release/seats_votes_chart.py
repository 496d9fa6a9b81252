"""Seats against votes: one panel per party or alliance."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import altair as alt
import numpy as np
import pandas as pd

from aggregator.release.chamber import Chamber
from aggregator.release.chart_style import INK, MUTED, CodeLook, Layout, colour_of, shape_of

AXIS_ROOM = 30
GAP = 24


@dataclass(frozen=True)
class SeatsVotesPanel:
    """One code: its look, its curve (rows of ``seats_votes.csv``), and where it is expected to be."""

    look: CodeLook
    curve: pd.DataFrame
    votes: float
    seats: float


def build_seats_votes_chart(
    panels: Sequence[SeatsVotesPanel], *, chamber: Chamber, layout: Layout
) -> alt.ConcatChart:
    """Draw each code's seats by its share of the vote, with the majority line across.

    Parameters
    ----------
    panels
        The codes, in the order wanted.
    chamber
        Gives the majority line.
    """
    across = min(len(panels), 4 if layout.long_names else 2)
    width = (layout.width - 30 - AXIS_ROOM - GAP * (across - 1)) // across
    lowest = min(float(panel.curve["q05"].min()) for panel in panels)
    top = max(*(float(panel.curve["q95"].max()) for panel in panels), chamber.line[1] * 1.05)
    domain = [min(0.0, lowest), top]
    looks = [panel.look for panel in panels]
    drawn = [
        _panel(
            panel,
            looks=looks,
            chamber=chamber,
            domain=domain,
            width=width,
            first=place % across == 0,
            layout=layout,
        )
        for place, panel in enumerate(panels)
    ]
    return alt.concat(*drawn, columns=across, spacing=GAP)


def _panel(
    panel: SeatsVotesPanel,
    *,
    looks: Sequence[CodeLook],
    chamber: Chamber,
    domain: list[float],
    width: int,
    first: bool,
    layout: Layout,
) -> alt.LayerChart | alt.FacetChart:
    curve = panel.curve[["code", "votes", "mean", "q05", "q95"]]
    low, high = float(curve["votes"].min()), float(curve["votes"].max())
    x = alt.X(
        "votes:Q",
        scale=alt.Scale(domain=[low, high], nice=False, zero=False),
        axis=alt.Axis(
            title="percent of the vote", values=_fives(low, high), ticks=False, grid=False, labelFlush=False
        ),
    )
    scale = alt.Scale(domain=domain, nice=False)
    axis = alt.Axis(title=None, labels=first, ticks=False, domain=False, tickCount=6)

    def y(name: str) -> alt.Y:
        return alt.Y(f"{name}:Q", scale=scale, axis=axis)

    base = alt.Chart(curve).encode(x=x, color=colour_of(looks))
    expected = {"code": [panel.look.code], "votes": [panel.votes], "seats": [panel.seats]}
    here = alt.Chart(pd.DataFrame(expected))
    title = alt.TitleParams(
        text=panel.look.name if layout.long_names else panel.look.code,
        anchor="start",
        frame="group",
        fontSize=layout.font_size,
        fontWeight=600,
        color=INK,
        limit=width,
        offset=6,
    )
    return alt.layer(
        base.mark_area(opacity=0.2).encode(y=y("q05"), y2="q95:Q"),
        base.mark_line(strokeWidth=2).encode(y=y("mean")),
        *_majority_layers(chamber, y, labelled=first, layout=layout),
        _unit_layer(layout),
        here.mark_point(size=80, filled=True, opacity=1, stroke="white", strokeWidth=1).encode(
            x=x, y=y("seats"), color=colour_of(looks), shape=shape_of(looks)
        ),
    ).properties(width=width, height=250 if layout.long_names else 190, title=title)


def _unit_layer(layout: Layout) -> alt.Chart:
    """The unit above the panel: as an axis title it would push the first panel's name up."""
    unit = alt.Chart(pd.DataFrame({"label": ["seats"]}))
    text = unit.mark_text(align="left", baseline="bottom", dy=-4, color=MUTED, fontSize=layout.font_size - 1)
    return text.encode(x=alt.XValue(0), y=alt.YValue(0), text="label:N")


def _majority_layers(
    chamber: Chamber, y: Callable[[str], alt.Y], *, labelled: bool, layout: Layout
) -> list[alt.Chart]:
    line = pd.DataFrame(
        {
            "line": [float(chamber.middle_line)],
            "low": [float(chamber.line[0])],
            "high": [float(chamber.line[1])],
            "label": ["majority"],
        }
    )
    base = alt.Chart(line)
    layers = [base.mark_rule(color=INK, strokeWidth=1.2).encode(y=y("line"))]
    if chamber.line_moves:
        layers.append(base.mark_rect(color=MUTED, opacity=0.16).encode(y=y("low"), y2="high:Q"))
    if labelled:
        text = base.mark_text(
            align="left", baseline="bottom", dx=3, dy=-2, color=INK, fontSize=layout.font_size - 1
        )
        layers.append(text.encode(x=alt.XValue(0), y=y("line"), text="label:N"))
    return layers


def _fives(low: float, high: float) -> list[float]:
    """Ticks at multiples of five percent."""
    return [float(tick) for tick in np.arange(np.ceil(low / 5) * 5, high + 1e-9, 5)]
