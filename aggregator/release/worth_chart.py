"""How the worth of a poll of 1,000 falls with its age."""

from __future__ import annotations

import altair as alt
import numpy as np
import pandas as pd

from aggregator.release.chart_style import MUTED, Layout

TODAY_COLOUR = "#2f5d62"
POLLING_DAY_COLOUR = "#a65e2e"
FULL_WORTH = 1_000


def build_worth_chart(shelf_life: pd.DataFrame, *, layout: Layout) -> alt.LayerChart:
    """Fresh respondents a poll of 1,000 is worth, by age: for support now, and as a guide to polling day.

    Parameters
    ----------
    shelf_life
        Rows of ``shelf_life.csv`` for one code.
    """
    width = layout.width - (250 if layout.long_names else 90)
    height = 320 if layout.long_names else 260
    rows = shelf_life.sort_values("age_days")
    x = alt.X(
        "age_days:Q",
        title="age of the poll, days",
        scale=alt.Scale(nice=False),
        axis=alt.Axis(grid=False, tickCount=8),
    )
    y_axis = alt.Axis(
        title="respondents it is worth",
        titleAngle=0,
        titleAlign="left",
        titleAnchor="start",
        titleX=0,
        titleY=-10,
        ticks=False,
        domain=False,
        tickCount=5,
    )
    scale = alt.Scale(domain=[0, FULL_WORTH], nice=False)
    layers: list[alt.Chart] = []
    labels = []
    for name, colour, dash, label in (
        ("worth_today", TODAY_COLOUR, [1, 0], "on the day of the run"),
        ("worth_polling_day", POLLING_DAY_COLOUR, [6, 4], "as a guide to polling day"),
    ):
        frame = rows[["age_days", name, f"{name}_q05", f"{name}_q95"]].rename(
            columns={name: "worth", f"{name}_q05": "q05", f"{name}_q95": "q95"}
        )
        base = alt.Chart(frame).encode(x=x)
        layers += [
            base.mark_area(opacity=0.16, color=colour, clip=True).encode(
                y=alt.Y("q05:Q", scale=scale, axis=y_axis), y2="q95:Q"
            ),
            base.mark_line(strokeWidth=2.4, strokeDash=dash, color=colour).encode(
                y=alt.Y("worth:Q", scale=scale, axis=y_axis)
            ),
        ]
        labels.append(
            {
                "age_days": frame["age_days"].iloc[-1],
                "worth": frame["worth"].iloc[-1],
                "label": label,
                "colour": colour,
            }
        )
    half = pd.DataFrame({"worth": [FULL_WORTH / 2], "label": ["half its worth"]})
    layers += [
        alt.Chart(half)
        .mark_rule(strokeDash=[2, 3], color=MUTED)
        .encode(y=alt.Y("worth:Q", scale=scale, axis=y_axis)),
        alt.Chart(half)
        .mark_text(align="right", baseline="bottom", dy=-3, color=MUTED, fontSize=layout.font_size - 1)
        .encode(x=alt.value(width), y=alt.Y("worth:Q", scale=scale, axis=y_axis), text="label:N"),
    ]
    ends = pd.DataFrame(labels)
    gap = (2.2 if not layout.long_names else 1.4) * layout.font_size * FULL_WORTH / height
    order = np.argsort(ends["worth"].to_numpy())
    placed = ends["worth"].to_numpy(dtype=float).copy()
    placed[order[1]] = max(placed[order[1]], placed[order[0]] + gap)
    ends["placed"] = placed
    ends["lines"] = [label if layout.long_names else label.split(" ") for label in ends["label"]]
    for row in ends.to_dict("records"):
        layers.append(
            alt.Chart(pd.DataFrame([{"placed": row["placed"]}]))
            .mark_text(
                align="left",
                baseline="middle",
                fontSize=layout.font_size,
                color=row["colour"],
                fontWeight=600,
                text=row["lines"],
                lineHeight=layout.font_size + 1,
            )
            .encode(x=alt.value(width + 8), y=alt.Y("placed:Q", scale=scale, axis=y_axis))
        )
    return alt.layer(*layers).properties(width=width, height=height)
