"""Error by days before polling day: this program and the rivals."""

from __future__ import annotations

from dataclasses import dataclass

import altair as alt
import pandas as pd

from aggregator.release.chart_style import Layout
from aggregator.release.label_placing import spread_labels
from aggregator.replays.methods import Method, Quantity
from aggregator.replays.result_shares import COUNTRY
from aggregator.replays.summarise_scores import without_alliances

DAYS_TOGETHER = 7
"""Dates of several contests fall on different days: they are averaged by the week."""


@dataclass(frozen=True)
class MethodLook:
    """Colour, dash and short label of a method."""

    colour: str
    dash: tuple[int, ...]
    label: str
    short: str


METHOD_LOOKS = {
    Method.FIELDFOLD: MethodLook("#2f5d62", (1, 0), "this model", "model"),
    Method.LATEST_POLL: MethodLook("#b5562a", (2, 2), "latest poll", "latest"),
    Method.MEAN_30_DAYS: MethodLook("#5b4b8a", (6, 3), "mean of 30 days", "30 days"),
    Method.DECAYING_MEAN: MethodLook("#8a6d1b", (10, 3, 2, 3), "decaying mean", "decaying"),
    Method.LAST_RESULT: MethodLook("#6d767b", (1, 4), "last result", "last"),
    Method.UNIFORM_SWING: MethodLook("#9c3f6b", (4, 2, 1, 2), "uniform swing", "swing"),
}


def errors_by_days(scores: pd.DataFrame, *, quantity: Quantity) -> pd.DataFrame:
    """Mean absolute error over parties and others in the country, by method and days before polling day.

    Returns
    -------
    pandas.DataFrame
        ``method, days_before, error``. With several contests, days are the start of their week, and each
        contest counts once in it.
    """
    rows = without_alliances(scores)
    rows = rows[(rows["quantity"] == quantity) & (rows["region"] == COUNTRY)]
    days = rows["days_before"].astype(int)
    if rows["contest"].nunique() > 1:
        days = days // DAYS_TOGETHER * DAYS_TOGETHER
    rows = rows.assign(absolute=rows["error"].abs(), days_before=days)
    by_contest = rows.groupby(["method", "days_before", "contest"])["absolute"].mean()
    return by_contest.groupby(level=["method", "days_before"]).mean().rename("error").reset_index()


def build_error_chart(errors: pd.DataFrame, *, unit: str, layout: Layout) -> alt.LayerChart | alt.FacetChart:
    """Draw one line per method, time running to polling day at the right, each labelled at its end.

    Parameters
    ----------
    errors
        From ``errors_by_days``.
    unit
        Title of the vertical axis.
    """
    width = layout.width - (190 if layout.long_names else 100)
    height = 340 if layout.long_names else 250
    top = max(float(errors["error"].max()) * 1.06, 0.1)
    first = max(int(errors["days_before"].max()), 1)
    x = alt.X(
        "days_before:Q",
        title="days before polling day",
        scale=alt.Scale(domain=[0, first], nice=False, reverse=True),
        axis=alt.Axis(grid=False, tickCount=width // 70, tickMinStep=1, labelFlush=False),
    )
    scale = alt.Scale(domain=[0, top], nice=False)
    axis = alt.Axis(
        title=unit, titleAngle=0, titleAlign="left", titleAnchor="start", titleX=0, titleY=-12, ticks=False,
        domain=False, tickCount=6,
    )  # fmt: skip
    methods = [method for method in Method if (errors["method"] == method).any()]
    lines = {method: errors[errors["method"] == method].sort_values("days_before") for method in methods}
    ends = [float(lines[method]["error"].iloc[0]) for method in methods]
    gap = 1.35 * layout.font_size * top / height
    placed = spread_labels(ends, gap=gap, low=0.0, high=top)
    layers: list[alt.Chart] = []
    for method, place in zip(reversed(methods), reversed(list(placed)), strict=True):
        look = METHOD_LOOKS[method]
        own = method is Method.FIELDFOLD
        base = alt.Chart(lines[method]).encode(x=x, y=alt.Y("error:Q", scale=scale, axis=axis))
        label = alt.Chart(
            pd.DataFrame({"error": [place], "label": [look.label if layout.long_names else look.short]})
        )
        layers += [
            base.mark_line(strokeWidth=3 if own else 1.8, strokeDash=list(look.dash), color=look.colour),
            base.mark_point(size=20 if own else 8, filled=True, opacity=1, color=look.colour),
            label.mark_text(
                align="left", baseline="middle", fontSize=layout.font_size, fontWeight=700 if own else 400,
                color=look.colour,
            ).encode(x=alt.XValue(width + 8), y=alt.Y("error:Q", scale=scale, axis=axis), text="label:N"),
        ]  # fmt: skip
    return alt.layer(*layers).properties(width=width, height=height)
