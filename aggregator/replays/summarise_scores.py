"""Means of scores by method, quantity and days before polling day."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pandas as pd

from aggregator.release.table_words import Level
from aggregator.replays.distribution_scores import INTERVALS
from aggregator.replays.methods import LEADS, Lead, Method, Where
from aggregator.replays.result_shares import COUNTRY

_MEANS = [
    "crps",
    "log_score",
    *(f"width_{percent}" for percent in INTERVALS),
    *(f"inside_{percent}" for percent in INTERVALS),
]
SUMMARY_COLUMNS = [
    "method", "quantity", "where", "lead", "contests", "dates", "figures", "mean_absolute_error",
    "root_mean_square_error", *_MEANS,
]  # fmt: skip
_ORDER = {str(method): place for place, method in enumerate(Method)}


def without_alliances(scores: pd.DataFrame) -> pd.DataFrame:
    """Scores of parties and others: alliances would count their members again."""
    return scores[scores["level"] != Level.ALLIANCE]


def where_of(scores: pd.DataFrame) -> pd.Series:
    """Whether each row is of the country or of a region."""
    return pd.Series(
        np.where(scores["region"] == COUNTRY, str(Where.COUNTRY), str(Where.REGIONS)), index=scores.index
    )


def rows_by_lead(scores: pd.DataFrame) -> Iterator[tuple[Lead, pd.DataFrame]]:
    """Each band of days before polling day that has rows, with them."""
    for lead in LEADS:
        rows = scores[[lead.holds(days) for days in scores["days_before"]]]
        if len(rows):
            yield lead, rows


def summarise_scores(scores: pd.DataFrame) -> pd.DataFrame:
    """Average scores of parties and others, over dates and contests.

    Every figure counts the same; a rival's score averages the dates on which it had something to say.

    Parameters
    ----------
    scores
        As ``ReplayScores.scores``, of any number of contests.
    """
    kept = without_alliances(scores)
    kept = kept.assign(where=where_of(kept), absolute=kept["error"].abs(), square=kept["error"] ** 2)
    tables = []
    for lead, rows in rows_by_lead(kept):
        grouped = rows.groupby(["method", "quantity", "where"])
        means = grouped[["absolute", "square", *_MEANS]].mean()
        means["contests"] = grouped["contest"].nunique()
        means["dates"] = grouped[["contest", "as_of"]].apply(lambda found: len(found.drop_duplicates()))
        means["figures"] = grouped.size()
        tables.append(means.reset_index().assign(lead=lead.label))
    table = pd.concat(tables, ignore_index=True)
    table["mean_absolute_error"], table["root_mean_square_error"] = (
        table["absolute"],
        np.sqrt(table["square"]),
    )
    percent = {f"inside_{p}": 100 * table[f"inside_{p}"] for p in INTERVALS}
    leads = {lead.label: place for place, lead in enumerate(LEADS)}
    table = table.assign(**percent, _lead=table["lead"].map(leads), _method=table["method"].map(_ORDER))
    table = table.sort_values(["quantity", "where", "_lead", "_method"], ascending=[False, True, True, True])
    return table.reset_index(drop=True)[SUMMARY_COLUMNS]
