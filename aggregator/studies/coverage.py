"""How often intervals hold the truth, and how sure that is: elections are drawn again, not their numbers.

The numbers of one election share its errors, so their count says little: what is independent are elections.
The bootstrap therefore draws whole elections.

References
----------
.. [1] Davison, A. C. and Hinkley, D. V. (1997). Bootstrap Methods and their Application, section 3.8 (data
   that come in clusters). Cambridge University Press.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import numpy.typing as npt
import pandas as pd
from scipy.stats import bootstrap

from aggregator.replays.distribution_scores import INTERVALS
from aggregator.studies.invented_elections import COUNTRY, Quantity

RESAMPLES = 4000
SURE = 0.95
"""Part of the resampled elections that an interval of a pooled figure holds."""
SIZE_EDGES = (0.0, 5.0, 15.0, 30.0, 100.0)
"""Bands of a party's estimated support, percent."""


def groups_of(judged: pd.DataFrame) -> dict[str, pd.DataFrame]:
    """Rows taken together in pooled figures, by what they are.

    Parties are grouped by their estimate: by the truth, intervals of the small would seem to miss it upwards.
    """
    support = judged["quantity"] != Quantity.SEATS
    polling_day = judged["quantity"] == Quantity.SUPPORT_POLLING_DAY
    national = judged["region"] == COUNTRY
    groups = {
        "all support": support,
        "support on polling day, country": polling_day & national,
        "support on polling day, regions": polling_day & ~national,
        "support today, country": judged["quantity"] == Quantity.SUPPORT_TODAY,
        "seats": judged["quantity"] == Quantity.SEATS,
    }
    for low, high in pairwise(SIZE_EDGES):
        inside = judged["estimate"].ge(low) & judged["estimate"].lt(high)
        groups[f"all support, estimates of {low:g} to {high:g} %"] = support & inside
    return {name: judged[rows] for name, rows in groups.items() if rows.any()}


def summarise_coverage(judged: pd.DataFrame, *, rng: np.random.Generator) -> pd.DataFrame:
    """Part of the intervals that hold the truth, by group and stated percentage.

    Parameters
    ----------
    judged
        Rows of :func:`aggregator.studies.judged_fits.judge_fit` for any number of elections.
    rng
        For the bootstrap.

    Returns
    -------
    pandas.DataFrame
        Columns ``group``, ``stated`` (percent), ``elections``, ``intervals``, ``inside`` (percent), ``low``
        and ``high``: the 95 % interval of ``inside``, bootstrapped by election; blank for a single election.
    """
    rows = []
    for name, group in groups_of(judged).items():
        for percent in INTERVALS:
            by_election = group.groupby("election")[f"inside_{percent}"].agg(["sum", "count"])
            hits, counts = by_election["sum"].to_numpy(float), by_election["count"].to_numpy(float)
            low, high = ratio_interval(hits, counts, rng=rng)
            inside = hits.sum() / counts.sum()
            rows.append((name, percent, len(counts), int(counts.sum()), 100 * inside, 100 * low, 100 * high))
    return pd.DataFrame(rows, columns=["group", "stated", "elections", "intervals", "inside", "low", "high"])


def summarise_scores(judged: pd.DataFrame) -> pd.DataFrame:
    """Mean error, CRPS and width by group: percent of the vote, or seats."""
    rows = [
        (
            name,
            group["election"].nunique(),
            len(group),
            float((group["estimate"] - group["truth"]).abs().mean()),
            float(group["crps"].mean()),
            *(float(group[f"width_{percent}"].mean()) for percent in INTERVALS),
        )
        for name, group in groups_of(judged).items()
    ]
    widths = [f"width_{percent}" for percent in INTERVALS]
    return pd.DataFrame(
        rows, columns=["group", "elections", "numbers", "mean_absolute_error", "crps", *widths]
    )


def ratio_interval(
    above: npt.NDArray[np.float64], below: npt.NDArray[np.float64], *, rng: np.random.Generator
) -> tuple[float, float]:
    """Bootstrap interval of a ratio of sums over elections, 95 %, by percentiles; NaN for a single election.

    Parameters
    ----------
    above, below
        What is summed, dims (election).
    rng
        Draws the elections.
    """
    if above.size < 2:
        return np.nan, np.nan
    result = bootstrap(
        (above, below),
        _ratio_of_sums,
        n_resamples=RESAMPLES,
        confidence_level=SURE,
        method="percentile",
        paired=True,
        vectorized=True,
        rng=rng,
    )
    return float(result.confidence_interval.low), float(result.confidence_interval.high)


def _ratio_of_sums(
    above: npt.NDArray[np.float64], below: npt.NDArray[np.float64], axis: int = -1
) -> npt.NDArray[np.float64]:
    return np.asarray(above.sum(axis=axis) / below.sum(axis=axis))
