"""Rows of the release's tables, picked by what they say."""

from __future__ import annotations

import pandas as pd

from aggregator.release.table_words import Kind, Level
from aggregator.seats.majorities import Outcome


def last_row(table: pd.DataFrame, *, code: str, kind: Kind) -> pd.Series | None:
    """Pick the row of a code on the last date of a kind; None where it has none."""
    rows = table[(table["code"] == code) & (table["kind"] == kind)]
    return None if rows.empty else rows.sort_values("date", kind="stable").iloc[-1]


def national_parties(support: pd.DataFrame, *, kind: Kind) -> pd.DataFrame:
    """Pick the parties (not the others) in the country on the last date of a kind, most support first."""
    rows = support[(support["region"] == "") & (support["kind"] == kind) & (support["level"] == Level.PARTY)]
    return rows[rows["date"] == rows["date"].max()].sort_values("mean", ascending=False, kind="stable")


def largest_code(support: pd.DataFrame, *, kind: Kind) -> str:
    """Name the party with most support in the country, by its mean, on the last date of a kind."""
    return str(national_parties(support, kind=kind)["code"].iloc[0])


def likeliest(chances: pd.DataFrame, outcome: Outcome, *, kind: Kind) -> pd.Series:
    """Pick the likeliest row of an outcome on the last date of a kind."""
    rows = chances[(chances["outcome"] == outcome) & (chances["kind"] == kind)]
    rows = rows[rows["date"] == rows["date"].max()]
    return rows.sort_values("probability", ascending=False, kind="stable").iloc[0]
