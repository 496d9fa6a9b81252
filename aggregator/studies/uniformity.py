"""Whether the truth lies anywhere among the draws alike: places against simultaneous bands.

The bands hold the whole curve of ordered places at once (Säilynoja, Bürkner & Vehtari 2022, Statistics and
Computing 32:32, doi:10.1007/s11222-022-10090-6), as ``arviz_stats`` computes them. Several quantities are
judged together, so each gets its part of the chance of a false alarm.

A band counts on places that are independent. Those of one election are not, so a quantity has one place per
election, and quantities are not thrown together.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import numpy.typing as npt
import pandas as pd
from arviz_stats.base import array_stats
from arviz_stats.ecdf_utils import ecdf_pit

BAND_SEED = 20_220_032
# Simulated curves outside the band, so many that its edge is found well.
CURVES_OUTSIDE = 8


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
        Places of the truth, 0–1: one row per election, one column per quantity.
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


def curves_of_places(places: pd.DataFrame, *, false_alarm: float) -> pd.DataFrame:
    """Curves of ordered places less the diagonal, with their band, for a chart.

    Returns
    -------
    One row per quantity and place: ``quantity``, ``place``, ``away`` (share of truths at or below the place,
    less the place), ``low``, ``high`` (the band less the place).
    """
    band = simultaneous_band(len(places), false_alarm=false_alarm / places.shape[1])
    at = band["place"].to_numpy()
    return pd.concat(
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
        ],
        ignore_index=True,
    )


def _curve(places: npt.NDArray[np.float64], at: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    return np.searchsorted(np.sort(places), at, side="right") / len(places)


def _inside(places: npt.NDArray[np.float64], band: pd.DataFrame) -> bool:
    curve = _curve(places, band["place"].to_numpy())[1:-1]
    return bool(((curve >= band["low"][1:-1]) & (curve <= band["high"][1:-1])).all())


def _chance(places: npt.NDArray[np.float64]) -> float:
    """Chance of uniform places that stray as far: the POT-C test of ``arviz_stats``."""
    chance, _, _ = array_stats.uniformity_test(places, method="pot_c")
    return float(chance)
