"""Which leans each row carries: of its house, era, mode, population, and way of asking."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
import pandas as pd

from aggregator.estimate.published_rows import Row
from aggregator.inputs.contest import Contest
from models.arrays import LeanArrays


def list_eras(rows: Sequence[Row]) -> pd.DataFrame:
    """List the eras of all houses, one per house and method label, houses by name, eras by first fieldwork.

    Returns
    -------
    Columns ``house``, ``method`` (blank where the house gives none), ``mode`` and ``population`` (the usual
    ones), ``polls``, ``usual_sample`` (respondents) and ``last`` (the last day of fieldwork).
    """
    table = pd.DataFrame(
        {
            "poll": [row.poll for row in rows],
            "house": [row.house for row in rows],
            "method": [row.method for row in rows],
            "mode": [row.mode for row in rows],
            "population": [row.population for row in rows],
            "size": [row.poll_respondents for row in rows],
            "first": [row.start for row in rows],
            "last": [row.end for row in rows],
        }
    ).drop_duplicates("poll")
    eras = table.groupby(["house", "method"], as_index=False).agg(
        mode=("mode", _most_frequent),
        population=("population", _most_frequent),
        polls=("poll", "count"),
        usual_sample=("size", "median"),
        first=("first", "min"),
        last=("last", "max"),
    )
    return eras.sort_values(["house", "first", "method"], ignore_index=True).drop(columns="first")


def _most_frequent(labels: pd.Series) -> str:
    counts = labels.value_counts()
    return str(min(counts[counts == counts.max()].index))


def lean_arrays(rows: Sequence[Row], *, eras: pd.DataFrame, contest: Contest) -> LeanArrays:
    """Number the terms of every row; a kind with a single level has none, since nothing tells it apart."""
    houses = list(dict.fromkeys(eras["house"]))
    changed = eras[eras["house"].duplicated(keep=False)]
    modes = _levels(row.mode for row in rows)
    populations = [
        label for label in _levels(row.population for row in rows) if label != contest.model.target_population
    ]
    formations = [a.code for a in contest.alliances if _asked_both_ways(rows, a.code, a.members)]
    kinds = (
        [(house,) for house in houses],
        list(zip(changed["house"], changed["method"], strict=True)),
        [(mode,) for mode in modes],
        [(population,) for population in populations],
        [(code,) for code in formations],
    )
    number: list[dict[tuple[str, ...], int]] = []
    total = 0
    for labels in kinds:
        number.append({label: total + i for i, label in enumerate(labels)})
        total += len(labels)
    of_house, of_era, of_mode, of_population, of_formation = number
    terms = [
        [
            of_house[(row.house,)],
            of_era.get((row.house, row.method), total),
            of_mode.get((row.mode,), total),
            of_population.get((row.population,), total),
            *(of_formation[(code,)] if code in row.together else total for code in formations),
        ]
        for row in rows
    ]
    return LeanArrays(
        eras=tuple(f"{house}, {method}" for house, method in of_era),
        era_house=np.array([of_house[(house,)] for house, _ in of_era], dtype=np.int64),
        modes=tuple(modes),
        mode_share=_mode_share(rows, modes),
        populations=tuple(populations),
        formations=tuple(formations),
        formation_members=np.array(
            [[float(p in contest.members_of(code)) for p in contest.party_codes] for code in formations]
        ).reshape(len(formations), len(contest.party_codes)),
        terms_of_row=np.array(terms, dtype=np.int64),
    )


def _levels(labels: Iterable[str]) -> list[str]:
    """Labels in use, sorted; none where there is only one."""
    levels = sorted({label for label in labels if label})
    return levels if len(levels) > 1 else []


def _asked_both_ways(rows: Sequence[Row], code: str, members: tuple[str, ...]) -> bool:
    """Tell whether some rows give an alliance as one, and others a member by itself."""
    singly = any(cell == {member} for row in rows for cell, _ in row.cells for member in members)
    return singly and any(code in row.together for row in rows)


def _mode_share(rows: Sequence[Row], modes: Sequence[str]) -> np.ndarray:
    """Share of the houses that work in each mode; a house with several counts by its polls."""
    if not modes:
        return np.zeros(0)
    polls = pd.DataFrame(
        {"poll": [r.poll for r in rows], "house": [r.house for r in rows], "mode": [r.mode for r in rows]}
    )
    polls = polls[polls["mode"] != ""].drop_duplicates("poll")
    by_house = pd.crosstab(polls["house"], polls["mode"], normalize="index")
    return by_house.mean().reindex(list(modes), fill_value=0.0).to_numpy()
