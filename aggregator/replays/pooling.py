"""Replays of many contests taken together, by the size of a party and the days before polling day."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd

from aggregator.errors import UsageError
from aggregator.replays.calibration import summarise_places, summarise_reliability
from aggregator.replays.compare_methods import compare_methods, standard_error
from aggregator.replays.distribution_scores import INTERVALS
from aggregator.replays.methods import LEADS, Method, Quantity
from aggregator.replays.result_shares import COUNTRY
from aggregator.replays.score_replay import ReplayScores
from aggregator.replays.staleness import measure_staleness
from aggregator.replays.summarise_scores import rows_by_lead, summarise_scores, without_alliances

SIZE_EDGES = (0.0, 5.0, 15.0, 30.0, 100.0)
"""Percent of the vote as this program estimated it: the result itself must not choose the group."""
BY_SIZE_COLUMNS = [
    "method", "size_from", "size_to", "lead", "contests", "figures", "mean_absolute_error", "standard_error",
    "mean_error", "crps", *(f"inside_{percent}" for percent in INTERVALS), "width_90",
]  # fmt: skip


@dataclass(frozen=True)
class PooledReplays:
    """Replays of several contests together, unrounded; tables as ``docs/formats.md`` describes them.

    Attributes
    ----------
    titles
        The contests.
    scores, seat_scores
        Rows of all of them.
    by_size
        Support in the country by size of party and days before polling day.
    reliability, places, summary, comparisons, staleness
        As of one contest, over all.
    """

    titles: tuple[str, ...]
    scores: pd.DataFrame
    seat_scores: pd.DataFrame
    by_size: pd.DataFrame
    reliability: pd.DataFrame
    places: pd.DataFrame
    summary: pd.DataFrame
    comparisons: pd.DataFrame
    staleness: pd.DataFrame


def pool_replays(replays: Sequence[ReplayScores]) -> PooledReplays:
    """Take the replays of several contests together.

    Parameters
    ----------
    replays
        One or more, in any order; contests are told apart by their titles.

    Raises
    ------
    UsageError
        If two contests have the same title, or there are none.
    """
    titles = tuple(sorted(replay.title for replay in replays))
    twice = sorted({title for title in titles if titles.count(title) > 1})
    if twice:
        raise UsageError(f"two contests are called {twice[0]!r}: give each its own title in contest.toml")
    if not titles:
        raise UsageError("there is no scored replay to pool: add result_outcome.csv to the contests")
    ordered = sorted(replays, key=lambda replay: replay.title)
    scores = _together([replay.scores for replay in ordered])
    return PooledReplays(
        titles=titles,
        scores=scores,
        seat_scores=_together([replay.seat_scores for replay in ordered]),
        by_size=summarise_by_size(scores),
        reliability=summarise_reliability(_together([replay.seat_chances for replay in ordered])),
        places=summarise_places(scores),
        summary=summarise_scores(scores),
        comparisons=compare_methods(scores),
        staleness=measure_staleness(
            scores,
            poll_errors=_together([replay.poll_errors for replay in ordered]),
            expected_errors=_together([replay.expected_errors for replay in ordered]),
        ),
    )


def summarise_by_size(scores: pd.DataFrame) -> pd.DataFrame:
    """Errors of support in the country by size of party, days before polling day, and method.

    Parameters
    ----------
    scores
        As ``ReplayScores.scores``, of any number of contests.

    Returns
    -------
    pandas.DataFrame
        ``mean_absolute_error`` averages contests, each counted once; ``standard_error`` is over contests,
        NaN for one.
    """
    kept = without_alliances(scores)
    kept = kept[(kept["quantity"] == Quantity.SUPPORT) & (kept["region"] == COUNTRY)]
    keys = ["contest", "as_of", "code"]
    own = kept.loc[kept["method"] == Method.FIELDFOLD, [*keys, "estimate"]]
    kept = kept.merge(own.rename(columns={"estimate": "size"}), on=keys)
    kept["group"] = np.digitize(kept["size"], SIZE_EDGES[1:-1])
    kept["absolute"] = kept["error"].abs()
    methods = {str(method): place for place, method in enumerate(Method)}
    rows = []
    for lead, found in rows_by_lead(kept):
        for (method, group), figures in found.groupby(["method", "group"]):
            rows.append([methods[str(method)], int(group), lead.label, *_row_of(figures)])  # type: ignore[call-overload]
    order = {lead.label: place for place, lead in enumerate(LEADS)}
    rows.sort(key=lambda row: (row[1], order[str(row[2])], row[0]))
    named = [
        [str(list(Method)[int(row[0])]), SIZE_EDGES[int(row[1])], SIZE_EDGES[int(row[1]) + 1], *row[2:]]
        for row in rows
    ]
    return pd.DataFrame(named, columns=BY_SIZE_COLUMNS)


def _row_of(figures: pd.DataFrame) -> list[float]:
    names = ["absolute", "error", "crps", *(f"inside_{percent}" for percent in INTERVALS), "width_90"]
    by_contest = figures.groupby("contest")[names].mean()
    mean = by_contest.mean()
    error = standard_error(by_contest["absolute"].to_numpy(), units=float(len(by_contest)))
    inside = [100 * mean[f"inside_{percent}"] for percent in INTERVALS]
    return [
        len(by_contest), len(figures), mean["absolute"], error if np.isfinite(error) else np.nan,
        mean["error"], mean["crps"], *inside, mean["width_90"],
    ]  # fmt: skip


def _together(tables: Sequence[pd.DataFrame]) -> pd.DataFrame:
    filled = [table for table in tables if len(table)]
    return pd.concat(filled, ignore_index=True) if filled else tables[0]
