r"""Which method came nearer, and whether the difference is clear.

The unit is what repeats. Over several contests it is the contest: each gives one mean difference, and their
scatter gives the standard error. In a single contest only dates repeat, and neighbouring dates are almost the
same forecast: with r the correlation of one date's difference with the next's, n dates count as
:math:`n (1 - r)/(1 + r)` (the large-sample rule for a first-order autoregression, common practice), at least
1. The standard error is widened for few units by Student's t at the level of one standard deviation. A
difference within it is called no clear difference.

In a single contest "nearer" is said of that election alone. One election is one draw.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from scipy.stats import norm, t

from aggregator.replays.methods import RIVALS, Method, Nearer
from aggregator.replays.summarise_scores import rows_by_lead, where_of, without_alliances

COMPARED = ["quantity", "where", "lead", "rival", "contests", "dates", "unit", "units"]
COMPARISON_COLUMNS = [
    *COMPARED, "own_error", "rival_error", "difference", "standard_error", "own_crps", "rival_crps", "nearer",
]  # fmt: skip
_ONE_SD = float(norm.cdf(1.0))
FEWEST_DATES = 6
"""Fewer dates do not show how alike neighbours are; they count as one."""
_KEYS = ["contest", "as_of", "quantity", "region", "code"]


def compare_methods(scores: pd.DataFrame) -> pd.DataFrame:
    """Hold the mean absolute error of each rival against this program's, on the same dates and codes.

    Absolute errors, not CRPS, decide: a rival gives one number, and on CRPS a distribution has the easier
    game against one. Both are in the table.

    Parameters
    ----------
    scores
        As ``ReplayScores.scores``, of any number of contests.

    Returns
    -------
    pandas.DataFrame
        ``difference`` is the rival's mean absolute error minus this program's: above zero where this program
        was nearer. ``unit`` is ``contest`` or ``date``; ``units`` how many independent ones they come to.
    """
    kept = without_alliances(scores).assign(absolute=lambda rows: rows["error"].abs())
    kept = kept.assign(where=where_of(kept))
    own = kept[kept["method"] == Method.FIELDFOLD][[*_KEYS, "absolute", "crps"]]
    rows = []
    for rival in RIVALS:
        both = kept[kept["method"] == rival].merge(own, on=_KEYS, suffixes=("", "_own"))
        for lead, found in rows_by_lead(both):
            for (quantity, where), pairs in found.groupby(["quantity", "where"], sort=False):
                rows.append([quantity, where, lead.label, str(rival), *_compare(pairs)])
    return pd.DataFrame(rows, columns=COMPARISON_COLUMNS)


def _compare(pairs: pd.DataFrame) -> list[object]:
    names = ["gap", "absolute_own", "absolute", "crps_own", "crps"]
    pairs = pairs.assign(gap=pairs["absolute"] - pairs["absolute_own"])
    by_date = pairs.groupby(["contest", "as_of"])[names].mean()
    by_contest = by_date.groupby(level="contest").mean()
    contests = len(by_contest)
    values = (by_contest if contests > 1 else by_date)["gap"].to_numpy()
    units = float(contests) if contests > 1 else effective_number(values)
    difference, error = float(values.mean()), standard_error(values, units=units)
    nearer = Nearer.NO_CLEAR_DIFFERENCE
    if abs(difference) > error:
        nearer = Nearer.FIELDFOLD if difference > 0 else Nearer.RIVAL
    # Over codes, then dates, then contests: each contest counts once, as in the difference.
    own, rival, own_crps, rival_crps = (float(by_contest[name].mean()) for name in names[1:])
    return [
        contests, len(by_date), "contest" if contests > 1 else "date", units, own, rival, difference,
        error if np.isfinite(error) else np.nan, own_crps, rival_crps, str(nearer),
    ]  # fmt: skip


def effective_number(values: np.ndarray) -> float:
    """How many independent values a series of dates comes to, 1 to n."""
    count = len(values)
    centred = values - values.mean()
    variance = float((centred**2).sum())
    if count < FEWEST_DATES or variance < 1e-18:
        return 1.0
    # Bias of the lag-one correlation of short series, about (1 + 4 r)/n (Kendall 1954, from memory).
    r = float((centred[1:] * centred[:-1]).sum()) / variance
    r = min(max(r + (1 + 4 * r) / count, 0.0), 0.999)
    return float(np.clip(count * (1 - r) / (1 + r), 1.0, count))


def standard_error(values: np.ndarray, *, units: float) -> float:
    """Give the standard error of a mean, widened for few units; infinite where there is only one."""
    if units <= 1.0 + 1e-9 or len(values) < 2:
        return float("inf")
    return float(values.std(ddof=1) / np.sqrt(units) * t.ppf(_ONE_SD, units - 1.0))
