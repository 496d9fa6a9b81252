"""Whether chances come true as often as they say, and the truth lies where the draws put it.

Many dates of one election are nearly one and the same forecast. A band of chance that counted each of them as
a fresh one would be far too narrow, so bands count every seat (or party) once per contest. Even those are
narrow: seats of one election move together, and a good forecast leaves the band more often than its chance
says. Over many contests that wears off.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from scipy.stats import binom

from aggregator.release.table_words import Level
from aggregator.replays.methods import Method
from aggregator.replays.result_shares import COUNTRY

CHANCE_EDGES = (0.0, 0.02, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.98, 1.0)
PLACE_EDGES = tuple(np.round(np.linspace(0.0, 1.0, 11), 1))
BAND = 0.9
RELIABILITY_COLUMNS = [
    "chance_from", "chance_to", "forecasts", "mean_chance", "won", "share_won", "once", "low", "high",
]  # fmt: skip
PLACES_COLUMNS = ["quantity", "place_from", "place_to", "forecasts", "share", "once", "low", "high"]


def summarise_reliability(chances: pd.DataFrame) -> pd.DataFrame:
    """Chances of seats in bins: how many, their mean, how many came true, and the band to expect.

    Parameters
    ----------
    chances
        ``contest, as_of, seat, code, chance, won``, over any number of contests.

    Returns
    -------
    pandas.DataFrame
        One row per bin that holds a chance. ``low`` and ``high``: exact binomial 90 % band of the share that
        comes true if the chances are right and the ``once`` different seats and parties of the bin are
        independent.
    """
    if chances.empty:
        return pd.DataFrame(columns=RELIABILITY_COLUMNS)
    place = _bins(chances["chance"], CHANCE_EDGES)
    rows = []
    for number, found in chances.groupby(place):
        once = len(found.drop_duplicates(["contest", "seat", "code"]))
        mean, won = float(found["chance"].mean()), float(found["won"].sum())
        low, high = _band(once, mean)
        first, last = CHANCE_EDGES[int(number)], CHANCE_EDGES[int(number) + 1]  # type: ignore[call-overload]
        rows.append([first, last, len(found), mean, won, won / len(found), once, low, high])
    return pd.DataFrame(rows, columns=RELIABILITY_COLUMNS)


def summarise_places(scores: pd.DataFrame) -> pd.DataFrame:
    """Histogram of the place of the truth among the draws: flat where intervals are right.

    Parameters
    ----------
    scores
        As ``ReplayScores.scores``. Parties and others in the country count; alliances would count their
        members again.

    Returns
    -------
    pandas.DataFrame
        One row per quantity and tenth: ``forecasts``, their ``share``, and the exact binomial 90 % band of
        that share with every party counted ``once`` per contest.
    """
    ours = scores[
        (scores["method"] == Method.FIELDFOLD)
        & (scores["region"] == COUNTRY)
        & (scores["level"] != Level.ALLIANCE)
        & scores["pit"].notna()
    ]
    rows = []
    for quantity, found in ours.groupby("quantity", sort=False):
        once = len(found.drop_duplicates(["contest", "code"]))
        counts = np.bincount(_bins(found["pit"], PLACE_EDGES), minlength=len(PLACE_EDGES) - 1)
        for number, count in enumerate(counts):
            first, last = PLACE_EDGES[number], PLACE_EDGES[number + 1]
            share = count / len(found)
            rows.append([quantity, first, last, int(count), share, once, *_band(once, last - first)])
    return pd.DataFrame(rows, columns=PLACES_COLUMNS)


def _bins(values: pd.Series, edges: tuple[float, ...]) -> np.ndarray:
    inner = np.asarray(edges[1:-1], dtype=float)
    return np.digitize(values.to_numpy(float), inner)


def _band(once: int, chance: float) -> tuple[float, float]:
    low, high = binom.ppf([(1 - BAND) / 2, (1 + BAND) / 2], once, chance) / once
    return float(low), float(high)
