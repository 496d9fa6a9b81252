"""Whether places are uniform: simultaneous bands, a table of figures, and a picture.

The bands hold the whole curve of ordered places at once (Säilynoja, Bürkner & Vehtari 2022, Statistics and
Computing 32:32, doi:10.1007/s11222-022-10090-6), as ``arviz_stats`` computes them. Several quantities are
judged together, so each gets its part of the chance of a false alarm.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from pathlib import Path

import altair as alt
import numpy as np
import pandas as pd
import vl_convert
from arviz_stats.base import array_stats
from arviz_stats.ecdf_utils import ecdf_pit

from models.arrays import Floats
from tests.calibration.ranks import RankedElection

BAND_SEED = 20_220_032
# Simulated curves outside the band, so many that its edge is found well.
CURVES_OUTSIDE = 8
FONT = "Liberation Sans, Arial, sans-serif"
INK, MUTED, LINE, BAND, PAPER = "#1c2a30", "#5a6a70", "#0072B2", "#d9dfdc", "#fffdf9"


def gather_places(elections: Sequence[RankedElection]) -> pd.DataFrame:
    """Places of the truth, one row per election and one column per quantity."""
    return pd.DataFrame([e.place for e in elections], index=[e.seed for e in elections])


@cache
def simultaneous_band(count: int, *, false_alarm: float) -> pd.DataFrame:
    """Band that the curve of ``count`` uniform places leaves with a given chance.

    Returns
    -------
    ``place`` (0–1), ``low`` and ``high``: share of places up to it.
    """
    place, _, low, high = ecdf_pit(
        (np.arange(count) + 0.5) / count,
        1 - false_alarm,
        int(np.ceil(CURVES_OUTSIDE / false_alarm)),
        rng=np.random.default_rng(BAND_SEED),
    )
    return pd.DataFrame({"place": place, "low": low, "high": high})


def judge_places(places: pd.DataFrame, *, false_alarm: float) -> pd.DataFrame:
    """Hold every quantity's places against the band.

    Parameters
    ----------
    places
        From :func:`gather_places`.
    false_alarm
        Chance that any quantity leaves its band where all is right (at most).

    Returns
    -------
    One row per quantity: ``inside`` its band; ``chance`` of uniform places that stray as far, by another
    test; ``in_50`` and ``in_90``, shares of truths inside the central intervals; ``bias``, the mean of the
    places less a half, in standard errors; ``spread``, the variance of the places over that of uniform ones:
    above one where intervals are too narrow.
    """
    band = simultaneous_band(len(places), false_alarm=false_alarm / places.shape[1])
    centre = (places - 0.5).abs()
    return pd.DataFrame(
        {
            "inside": {name: _inside(places[name].to_numpy(), band) for name in places},
            "chance": {name: _chance(places[name].to_numpy()) for name in places},
            "in_50": (centre < 0.25).mean(),
            "in_90": (centre < 0.45).mean(),
            "bias": (places.mean() - 0.5) * np.sqrt(12 * len(places)),
            "spread": 12 * ((places - 0.5) ** 2).mean(),
        }
    ).rename_axis("quantity")


def _curve(places: Floats, at: Floats) -> Floats:
    return np.searchsorted(np.sort(places), at, side="right") / len(places)


def _inside(places: Floats, band: pd.DataFrame) -> bool:
    curve = _curve(places, band["place"].to_numpy())[1:-1]
    return bool(((curve >= band["low"][1:-1]) & (curve <= band["high"][1:-1])).all())


def _chance(places: Floats) -> float:
    """Chance of uniform places that stray as far: the POT-C test of ``arviz_stats``."""
    chance, _, _ = array_stats.uniformity_test(places, method="pot_c")
    return float(chance)


def draw_chart(places: pd.DataFrame, *, false_alarm: float, columns: int = 4) -> alt.FacetChart:
    """Curves of ordered places less the diagonal, one panel per quantity, each with its band."""
    band = simultaneous_band(len(places), false_alarm=false_alarm / places.shape[1])
    at = band["place"].to_numpy()
    panels = pd.concat(
        [
            pd.DataFrame(
                {
                    "quantity": name,
                    "place": at,
                    "away": _curve(places[name].to_numpy(), at) - at,
                    "low": band["low"] - at,
                    "high": band["high"] - at,
                }
            )
            for name in places
        ]
    )
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
