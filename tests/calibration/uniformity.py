"""Places of the truth of elections drawn from the prior: a table of them, and a picture."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import altair as alt
import pandas as pd
import vl_convert

from aggregator.studies.uniformity import curves_of_places
from tests.calibration.ranks import RankedElection

FONT = "Liberation Sans, Arial, sans-serif"
INK, MUTED, LINE, BAND, PAPER = "#1c2a30", "#5a6a70", "#0072B2", "#d9dfdc", "#fffdf9"


def gather_places(elections: Sequence[RankedElection]) -> pd.DataFrame:
    """Places of the truth, one row per election and one column per quantity."""
    return pd.DataFrame([e.place for e in elections], index=[e.seed for e in elections])


def draw_chart(places: pd.DataFrame, *, false_alarm: float, columns: int = 4) -> alt.FacetChart:
    """Curves of ordered places less the diagonal, one panel per quantity, each with its band."""
    panels = curves_of_places(places, false_alarm=false_alarm)
    x = alt.X(
        "place:Q",
        title=None,
        axis=alt.Axis(values=[0, 0.5, 1], format=".1~f", grid=False),
    )
    y_axis = alt.Axis(values=[-0.1, 0, 0.1], grid=False)
    layers = alt.layer(
        alt.Chart().mark_area(color=BAND, interpolate="step-after").encode(x=x, y="low:Q", y2="high:Q"),
        alt.Chart().mark_rule(color=MUTED, strokeWidth=0.5).encode(y=alt.datum(0)),
        alt.Chart()
        .mark_line(color=LINE, interpolate="step-after", strokeWidth=1.5)
        .encode(x=x, y=alt.Y("away:Q", title=None, axis=y_axis)),
    ).properties(width=185, height=100)
    return (
        layers.facet(
            facet=alt.Facet(
                "quantity:N",
                sort=[str(name) for name in places],
                title=None,
                header=alt.Header(labelFontSize=12, labelFont=FONT, labelColor=INK, labelPadding=4),
            ),
            columns=columns,
            data=panels,
            spacing=14,
        )
        .properties(
            title=alt.TitleParams(
                f"Where the truth lies among the draws: {len(places)} elections drawn from the prior",
                subtitle=[
                    "Share of truths at or below each place, less the diagonal. Grey: where all curves stay "
                    f"together in {1 - false_alarm:.0%} of studies if every interval is right."
                ],
                anchor="start",
                fontSize=16,
                subtitleFontSize=12,
                font=FONT,
                subtitleFont=FONT,
                color=INK,
                subtitleColor=MUTED,
                offset=14,
            )
        )
        .configure(background=PAPER, padding=14)
        .configure_axis(
            labelFont=FONT, labelColor=MUTED, labelFontSize=10, domainColor=MUTED, tickColor=MUTED
        )
        .configure_view(stroke=None)
    )


def write_chart(chart: alt.FacetChart, path: Path) -> None:
    """Write a chart as SVG, drawn without any network."""
    path.write_text(vl_convert.vegalite_to_svg(chart.to_json()), encoding="utf-8")
