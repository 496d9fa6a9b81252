"""What the way of asking adds to a figure, and how far the polls can tell it from the houses."""

from __future__ import annotations

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.release.draw_summaries import stack_samples, summarise_samples
from aggregator.release.lean_schemas import MODE_LEANS
from aggregator.release.table_words import LeanKind
from models.dimensions import FORMATION, MODE, PARTY, POPULATION

POINTS = 100.0
TOLD_IN_PART_FROM, TOLD_WELL_FROM = 0.2, 0.6
"""A plain convention of this project: below a fifth of the variance told, a lean is as good as assumed; above
three fifths the interval is a good third narrower than before the polls (1 − √.4 = .37)."""


def told_words(learned: float) -> str:
    """Say how far the polls tell a lean from those of the houses.

    Parameters
    ----------
    learned
        One minus the posterior variance over the prior's.
    """
    if learned < TOLD_IN_PART_FROM:
        return "the polls cannot tell"
    return "partly" if learned <= TOLD_WELL_FROM else "well"


def build_mode_leans_table(draws: xr.Dataset) -> pd.DataFrame:
    """Summarise leans of modes, populations and alliances asked about as one; no rows where there are none.

    Parameters
    ----------
    draws
        Where the register has them: ``mode_lean`` (chain, draw, mode, party), ``mode_learned`` (mode, party),
        ``mode_houses`` (mode); the same for ``population``; ``formation_lean`` (chain, draw, formation),
        ``formation_learned`` and ``formation_polls`` (formation). Leans in shares, 0 to 1.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``MODE_LEANS``, leans in percentage points.
    """
    parts = [
        _by_party(draws, MODE, LeanKind.MODE),
        _by_party(draws, POPULATION, LeanKind.POPULATION),
        _asked_together(draws),
    ]
    table = pd.DataFrame([row for part in parts for row in part], columns=list(MODE_LEANS.column_names))
    return table.astype({name: float for name in ("lean", "q05", "q95", "houses", "polls", "learned")})


def _by_party(draws: xr.Dataset, dim: str, kind: LeanKind) -> list[dict[str, object]]:
    if f"{dim}_lean" not in draws:
        return []
    lean = summarise_samples(POINTS * stack_samples(draws[f"{dim}_lean"], dims=(dim, PARTY)))
    learned = draws[f"{dim}_learned"].transpose(dim, PARTY).values
    return [
        {
            "kind": kind.value,
            "label": str(label),
            "code": str(code),
            **{column: lean[name][i, j] for column, name in _SUMMARY.items()},
            "houses": draws[f"{dim}_houses"].values[i],
            "learned": np.clip(learned[i, j], 0.0, 1.0),
        }
        for i, label in enumerate(draws[dim].values)
        for j, code in enumerate(draws[PARTY].values)
    ]


def _asked_together(draws: xr.Dataset) -> list[dict[str, object]]:
    if "formation_lean" not in draws:
        return []
    lean = summarise_samples(POINTS * stack_samples(draws["formation_lean"], dims=(FORMATION,)))
    return [
        {
            "kind": LeanKind.ASKED_TOGETHER.value,
            "label": str(code),
            "code": str(code),
            **{column: lean[name][i] for column, name in _SUMMARY.items()},
            "polls": draws["formation_polls"].values[i],
            "learned": np.clip(draws["formation_learned"].values[i], 0.0, 1.0),
        }
        for i, code in enumerate(draws[FORMATION].values)
    ]


_SUMMARY = {"lean": "mean", "q05": "q05", "q95": "q95"}
