"""Rows of the tables about seats, picked and ordered for charts and page."""

from __future__ import annotations

from collections.abc import Collection, Hashable, Mapping
from typing import Any

import numpy as np
import pandas as pd

from aggregator.release.chamber import Chamber
from aggregator.release.table_rows import last_row
from aggregator.release.table_words import Kind, SeatsVotes
from aggregator.release.tables import ReleaseTables


def likeliest_combinations(table: pd.DataFrame, *, most: int) -> pd.DataFrame:
    """Pick alliances, and combinations that most often need every party, of polling day; surest first."""
    rows = table[table["kind"] == Kind.ON_POLLING_DAY]
    rows = rows.assign(allied=rows["alliance"] != "")
    chosen = rows.sort_values(["allied", "chance_minimal"], ascending=False, kind="stable").head(most)
    return chosen.drop(columns="allied").sort_values("chance", ascending=False, kind="stable")


def codes_nearest_the_line(
    tables: ReleaseTables, *, chamber: Chamber, most: int, among: Collection[str] | None = None
) -> list[str]:
    """Name the codes whose seats on polling day lie nearest to the majority line, measured by their spread.

    Parameters
    ----------
    tables
        The release's tables.
    chamber
        Gives the line.
    most
        How many codes at most.
    among
        Codes to choose from; by default those of the deciding seats.
    """
    if tables.seats is None:
        return []
    if among is None:
        among = set() if tables.deciding_seats is None else set(tables.deciding_seats["code"])
    distance = {}
    for code in dict.fromkeys(tables.seats["code"]):
        row = last_row(tables.seats, code=code, kind=Kind.ON_POLLING_DAY)
        if code in among and row is not None:
            distance[str(code)] = abs(row["mean"] - chamber.middle_line) / max(row["sd"], 0.5)
    return sorted(distance, key=lambda code: distance[code])[:most]


def deciding_seats_of(table: pd.DataFrame, *, code: str, most: int) -> pd.DataFrame:
    """Pick the seats that most often decide a code's majority, likeliest first; those that never do not."""
    rows = table[(table["code"] == code) & (table["decides"] > 0)]
    return rows.sort_values("decides", ascending=False, kind="stable").head(most)


def seat_name(row: Mapping[Hashable, Any]) -> str:
    """Name a seat: its name, its code where it has none."""
    name = row["name"]
    return str(row["seat"]) if pd.isna(name) or not str(name) else str(name)


def slope_row(table: pd.DataFrame, *, code: str) -> pd.Series:
    """Pick how many seats a point of the vote brings a code."""
    return table[(table["code"] == code) & (table["what"] == SeatsVotes.RESPONSIVENESS)].iloc[0]


def share_for_majority(table: pd.DataFrame, *, code: str, line: float) -> float | None:
    """Find the vote, in percent, at which the mean of a code's seats comes to the line; None off it."""
    curve = table[(table["code"] == code) & (table["what"] == SeatsVotes.CURVE)]
    # A mean over draws may fall by a hair where hardly a seat changes hands.
    seats = np.maximum.accumulate(curve["mean"].to_numpy())
    if not len(seats) or seats[0] > line or seats[-1] < line:
        return None
    return float(np.interp(line, seats, curve["votes"].to_numpy()))


def lead_rows(table: pd.DataFrame) -> pd.DataFrame:
    """Pick the leads at equal votes."""
    return table[table["what"] == SeatsVotes.LEAD_AT_EQUAL_VOTES]
