"""Charts of calibration: where the truth lay among the draws, and how often chances came true."""

from __future__ import annotations

import altair as alt
import pandas as pd

from aggregator.release.chart_style import GRID, INK, MUTED, PAPER, Layout
from aggregator.replays.calibration import CHANCE_EDGES
from aggregator.replays.methods import Quantity

_COLOUR = "#2f5d62"
_NAMES = {
    str(Quantity.SUPPORT): "Support: share of forecasts",
    str(Quantity.SEATS): "Seats: share of forecasts",
}


def build_places_chart(places: pd.DataFrame, *, layout: Layout) -> alt.ConcatChart:
    """One histogram per quantity; the grey band is where right forecasts would mostly end.

    Parameters
    ----------
    places
        Rows of ``places.csv``.
    """
    quantities = list(dict.fromkeys(places["quantity"]))
    columns = len(quantities) if layout.long_names else 1
    width = (layout.width - 60 * columns) // columns - 12 if layout.long_names else layout.width - 50
    width = min(width, 420)
    top = float(max(places["share"].max(), places["high"].max())) * 1.1
    panels = []
    for quantity in quantities:
        rows = places[places["quantity"] == quantity]
        scale = alt.Scale(domain=[0, top], nice=False)
        x = alt.X(
            "place_from:Q",
            title="place of the result among the draws",
            scale=alt.Scale(domain=[0, 1], nice=False),
            axis=alt.Axis(grid=False, format=".0%", values=[0, 0.25, 0.5, 0.75, 1], labelFlush=True),
        )
        axis = alt.Axis(title=None, ticks=False, domain=False, format=".0%", tickCount=5)
        base = alt.Chart(rows).encode(x=x, x2="place_to:Q")
        even = alt.Chart(pd.DataFrame({"share": [1 / len(rows)]}))
        panels.append(
            alt.layer(
                base.mark_rect(color=GRID).encode(y=alt.Y("low:Q", scale=scale, axis=axis), y2="high:Q"),
                base.mark_bar(color=_COLOUR, opacity=0.75, stroke=PAPER, strokeWidth=1.5).encode(
                    y=alt.Y("share:Q", scale=scale, axis=axis), y2=alt.Y2Datum(0)
                ),
                even.mark_rule(color=INK, strokeDash=[4, 3]).encode(
                    y=alt.Y("share:Q", scale=scale, axis=axis)
                ),
                title=alt.TitleParams(
                    _NAMES[quantity],
                    anchor="start",
                    fontSize=layout.font_size,
                    fontWeight=600,
                    color=INK,
                    offset=8,
                ),
            ).properties(width=width, height=210 if layout.long_names else 150)
        )
    return alt.concat(*panels, columns=columns, spacing=34)


def build_reliability_chart(reliability: pd.DataFrame, *, layout: Layout) -> alt.LayerChart | alt.FacetChart:
    """Share of chances that came true against the chance given; on the diagonal they are right.

    Parameters
    ----------
    reliability
        Rows of ``reliability.csv``.
    """
    width, height = (640, 400) if layout.long_names else (layout.width - 64, 250)
    percent = alt.Scale(domain=[0, 1], nice=False)
    ticks = [0, 0.25, 0.5, 0.75, 1]
    x_axis = alt.Axis(format=".0%", values=ticks, grid=False, labelFlush=True)
    y_axis = alt.Axis(
        title="came true", titleAngle=0, titleAlign="left", titleAnchor="start", titleX=0, titleY=-12,
        ticks=False, domain=False, format=".0%", values=ticks,
    )  # fmt: skip

    def at(x: str, y: str) -> dict[str, alt.X | alt.Y]:
        return {
            "x": alt.X(f"{x}:Q", title="chance given", scale=percent, axis=x_axis),
            "y": alt.Y(f"{y}:Q", scale=percent, axis=y_axis),
        }

    diagonal = alt.Chart(pd.DataFrame({"mean_chance": [0.0, 1.0], "share_won": [0.0, 1.0]}))
    base = alt.Chart(reliability)
    counted = reliability.assign(label=[f"{count:,.0f}" for count in reliability["forecasts"]])
    # Labels lean away from the diagonal, where the points are.
    below = counted["share_won"] <= counted["mean_chance"]
    never = counted["mean_chance"] < CHANCE_EDGES[1]
    sure = counted["mean_chance"] > CHANCE_EDGES[-2]
    layers = [
        base.mark_rule(strokeWidth=9, color=GRID, clip=True).encode(**at("mean_chance", "low"), y2="high:Q"),
        diagonal.mark_line(color=MUTED, strokeDash=[4, 3]).encode(**at("mean_chance", "share_won")),
        base.mark_point(size=60, filled=True, opacity=1, color=_COLOUR, stroke="white").encode(
            **at("mean_chance", "share_won")
        ),
    ]
    placed = (
        (counted[never], "left", -2, -26),
        (counted[sure], "right", 2, 26),
        (counted[below & ~never & ~sure], "left", 9, 0),
        (counted[~below & ~never & ~sure], "right", -9, 0),
    )
    for rows, align, dx, dy in placed:
        if len(rows):
            text = alt.Chart(rows).mark_text(
                align=align,  # type: ignore[arg-type]
                dx=dx,
                dy=dy,
                baseline="middle",
                fontSize=layout.font_size - 2,
                color=MUTED,
            )
            layers.append(text.encode(**at("mean_chance", "share_won"), text="label:N"))
    return alt.layer(*layers).properties(width=width, height=height)
