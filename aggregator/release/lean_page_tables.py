"""Leans as the page sets them out: houses by way of working, modes, populations, alliances as one."""

from __future__ import annotations

from collections.abc import Hashable
from typing import Any

import pandas as pd

from aggregator.release.contents import ReleaseContents
from aggregator.release.mode_leans_table import told_words
from aggregator.release.page_tables import PageTable
from aggregator.release.rounding import points_text, whole_text
from aggregator.release.table_words import LeanKind, Level

KIND_WORDS = {LeanKind.MODE: "Asked: {}", LeanKind.POPULATION: "Population: {}"}


def era_name(house: str, method: str) -> str:
    """Name a house, with the label of its way of working where it has had several."""
    return f"{house} ({method})" if method else house


def houses_table(contents: ReleaseContents) -> PageTable:
    """Set out the lean of every house by party, with the noise of its polls."""
    codes = [code for code in contents.codes if code.level is Level.PARTY]
    by_house: dict[tuple[str, str], dict[str, dict[Hashable, Any]]] = {}
    for row in contents.tables.houses.to_dict("records"):
        by_house.setdefault((row["house"], row["method"]), {})[row["code"]] = row
    body = []
    for (house, _), rows in by_house.items():
        one = next(iter(rows.values()))
        asked = ", ".join(_words(one[name]) for name in ("method", "mode", "population") if one[name])
        body.append(
            (
                f"{house}\n{asked}" if asked else house,
                whole_text(one["polls"]),
                whole_text(one["usual_sample"]),
                f"{one['design_effect']:.1f}",
                *(_lean_over_interval(rows[code.code]) for code in codes),
            )
        )
    return PageTable(
        "Leans in percentage points against the average of the houses, mode and population included (small, "
        "below the house, after its way of working where it has had several); 90 % intervals below. Design "
        "effect: how much noisier a poll of the usual size is than a simple random sample of that size.",
        (
            "House",
            "Polls",
            "Usual sample",
            "Design effect",
            *(code.name for code in codes),
        ),
        tuple(body),
    )


def ways_of_asking_table(contents: ReleaseContents) -> PageTable | None:
    """Set out what modes and populations add, and how far polls can tell; None where all polls are alike."""
    codes = [code for code in contents.codes if code.level is Level.PARTY]
    table = contents.tables.mode_leans
    table = table[table["kind"] != LeanKind.ASKED_TOGETHER]
    if table.empty:
        return None
    body = []
    for (kind, label), rows in table.groupby(["kind", "label"], sort=False):
        by_code = {row["code"]: row for row in rows.to_dict("records")}
        body.append(
            (
                KIND_WORDS[LeanKind(str(kind))].format(_words(str(label))),
                whole_text(rows["houses"].iloc[0]),
                told_words(float(rows["learned"].median())),
                *(_lean_over_interval(by_code[code.code]) for code in codes),
            )
        )
    return PageTable(
        "What the way of asking adds, in percentage points: a mode against the average of the houses, a "
        "population against that of the contest; 90 % intervals below. It is part of the houses' leans "
        "above. Told apart: how far the polls can tell it from what is the houses' own.",
        ("Way of asking", "Houses", "Told apart", *(code.name for code in codes)),
        tuple(body),
        words=frozenset({0, 2}),
    )


def asked_together_sentences(contents: ReleaseContents) -> list[str]:
    """Say what asking about an alliance as one adds to its figure."""
    table = contents.tables.mode_leans
    rows = table[table["kind"] == LeanKind.ASKED_TOGETHER].to_dict("records")
    return [
        f"{contents.names.get(row['code'], row['code'])} asked about as one gets {points_text(row['lean'])} "
        f"points against its members asked about one by one (90 % interval {points_text(row['q05'])} to "
        f"{points_text(row['q95'])}; {_polls(row['polls'])}). {_TOLD[told_words(row['learned'])]}"
        for row in rows
    ]


_TOLD = {
    "the polls cannot tell": "The polls cannot tell this from the leans of the houses that ask so.",
    "partly": "The polls tell this in part from the leans of the houses that ask so.",
    "well": "The polls tell this well from the leans of the houses that ask so.",
}


def _polls(number: float) -> str:
    return "1 poll" if number == 1 else f"{whole_text(number)} polls"


def _lean_over_interval(row: dict[Hashable, Any] | pd.Series) -> str:
    return f"{points_text(row['lean'])}\n{points_text(row['q05'])} to {points_text(row['q95'])}"


def _words(label: str) -> str:
    return label.replace("_", " ")
