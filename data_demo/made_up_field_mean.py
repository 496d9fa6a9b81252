"""What the field says: figures of the register by party, and their mean over recent polls of other houses."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import date, timedelta

import numpy as np

from data_demo.made_up_scenery import OTHERS, Scenery

RECENT_DAYS = 21
FEWEST_POLLS = 3

type PollRow = Mapping[str, object]


def offered_shares(row: PollRow, *, scenery: Scenery) -> dict[str, float]:
    """Shares of the decided by code, percent, others filled in where the house leaves them out."""
    columns = [*scenery.codes, *(a.code for a in scenery.alliances)]
    decided = 100 - number_in(row.get("undecided"), blank=0.0)
    printed = {code: 100 * number_in(row.get(code)) / decided for code in columns}
    shares = {code: share for code, share in printed.items() if not np.isnan(share)}
    return {OTHERS: max(0.0, 100 - sum(shares.values())), **shares}


def members_of(code: str, *, offered: Iterable[str], scenery: Scenery) -> list[int]:
    """Positions of the parties that a figure stands for; others take in whoever is not offered."""
    alliances = {a.code: a.members for a in scenery.alliances}
    if code in alliances:
        return [scenery.codes.index(member) for member in alliances[code]]
    if code != OTHERS:
        return [scenery.codes.index(code)]
    named = {p for c in offered if c != OTHERS for p in members_of(c, offered=(), scenery=scenery)}
    return [p for p in range(len(scenery.codes)) if p not in named]


def recent_polls(rows: Iterable[PollRow], *, day: date, house: str) -> list[PollRow]:
    """National rows of other houses published in the three weeks before a day."""
    first, last = str(day - timedelta(days=RECENT_DAYS)), str(day - timedelta(days=1))
    return [
        row
        for row in rows
        if row["region"] == "" and row["house"] != house and first <= str(row["published"]) <= last
    ]


def field_mean(rows: Iterable[PollRow], *, scenery: Scenery, last_shares: np.ndarray) -> np.ndarray:
    """Mean share by party over the rows that give it singly, 0–1, dims (party,).

    Parameters
    ----------
    last_shares
        The last result, for a party that no row gives singly.
    """
    found: list[list[float]] = [[] for _ in scenery.codes]
    for row in rows:
        shares = offered_shares(row, scenery=scenery)
        for code, share in shares.items():
            members = members_of(code, offered=shares, scenery=scenery)
            if len(members) == 1:
                found[members[0]].append(share)
    mean = np.array(
        [np.mean(shares) if shares else 100 * last for shares, last in zip(found, last_shares, strict=True)]
    )
    return mean / mean.sum()


def printed_figure(percent: float, *, grid: float) -> float:
    """Round a figure as its house does."""
    return round(float(np.floor(percent / grid + 0.5)) * grid, 1)


def number_in(value: object, *, blank: float = np.nan) -> float:
    """Number in a cell of the register, ``blank`` where it is empty."""
    number = np.nan if value is None else float(value)  # type: ignore[arg-type]
    return blank if np.isnan(number) else number
