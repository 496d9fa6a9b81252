"""Places of the truth among the draws, one per election and quantity, judged kind by kind."""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.studies.invented_elections import COUNTRY, Quantity
from aggregator.studies.uniformity import judge_places

FALSE_ALARM = 0.05
"""Chance that some quantity of a kind leaves its band though all is right: the usual simultaneous band."""
ANY_REGION = "support on polling day, a region and party drawn by lot"
KIND_WORDS = {
    Quantity.SUPPORT_POLLING_DAY: "support on polling day",
    Quantity.SUPPORT_TODAY: "support today",
    Quantity.SEATS: "seats",
}


def gather_places(judged: pd.DataFrame, *, rng: np.random.Generator) -> dict[str, pd.DataFrame]:
    """Places by kind: one row per election, one column per party.

    Parameters
    ----------
    judged
        Rows of :func:`aggregator.studies.judged_fits.judge_fit`.
    rng
        Draws the one region and party of each election that stands for all of them: the places of one
        election's regions are not independent.

    Returns
    -------
    By kind, in the order of publication. A party that some election lacks is left out.
    """
    national = judged[judged["region"] == COUNTRY]
    kinds = {
        KIND_WORDS[Quantity(str(kind))]: rows.pivot(index="election", columns="code", values="place")
        .reindex(columns=rows["code"].drop_duplicates())
        .dropna(axis="columns")
        for kind, rows in national.groupby("quantity", sort=False)
    }
    regions = judged[judged["region"] != COUNTRY]
    if not regions.empty:
        drawn = regions.groupby("election").sample(1, random_state=rng)
        kinds[ANY_REGION] = drawn.set_index("election")[["place"]].rename(columns={"place": "any"})
    return kinds


def judge_all_places(kinds: dict[str, pd.DataFrame]) -> pd.DataFrame:
    """Judge every kind by its own bands; columns ``kind``, ``code``, then those of ``judge_places``."""
    tables = [
        judge_places(places, false_alarm=FALSE_ALARM).rename_axis("code").reset_index().assign(kind=kind)
        for kind, places in kinds.items()
    ]
    together = pd.concat(tables, ignore_index=True)
    return together[["kind", *together.columns.drop("kind")]]
