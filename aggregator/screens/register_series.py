"""The register as screens look at it: rows with shares, whole polls, and polls that share no interviews."""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from typing import Any

import numpy as np
import pandas as pd

# Fieldwork of one house within this many days is compared: over six weeks opinion adds about a tenth to the
# variance of a poll of 1,000 (drift of .035 per root of a week in log units), and only ever adds.
WINDOW_DAYS = 42


def poll_table(polls: pd.DataFrame, *, regions: Sequence[str]) -> pd.DataFrame:
    """Fold regional rows into one row per poll, in register order.

    Parameters
    ----------
    polls
        As ``DeskInputs.polls``.
    regions
        All regions of the contest.

    Returns
    -------
    pandas.DataFrame
        ``poll``, ``house``, ``mode``, ``start``, ``end``, ``published``, ``days``, ``sample`` (respondents of
        the whole poll, as reported), ``regions`` (frozenset) and ``kind`` (national or regional).
    """
    columns = ["poll", "house", "mode", "start", "end", "published", "regions", "sample"]
    everywhere = frozenset(regions)
    found: dict[str, dict[Hashable, Any]] = {}
    for record in polls[columns].to_dict("records"):
        asked = frozenset(record["regions"])
        row = record | {"poll": str(record["poll"]), "regions": asked, "sample": float(record["sample"])}
        poll = found.setdefault(row["poll"], row | {"regions": frozenset(), "sample": 0.0})
        # A row for the whole country holds the respondents of the regional rows beside it.
        if asked == everywhere:
            poll["sample"] = row["sample"]
        elif poll["regions"] != everywhere:
            poll["sample"] += row["sample"]
        poll["regions"] |= asked
        poll["start"], poll["end"] = min(poll["start"], row["start"]), max(poll["end"], row["end"])
        poll["published"] = max(poll["published"], row["published"])
    table = pd.DataFrame(list(found.values()))
    table["days"] = (table["end"] - table["start"]).dt.days + 1
    table["kind"] = np.where(table["regions"] == everywhere, "national", "regional")
    return table


def without_shared_interviews(polls: pd.DataFrame) -> pd.DataFrame:
    """Leave out rows whose fieldwork overlaps an earlier row of the same house and regions.

    A tracking poll's figures share interviews, so they are alike without any reason to ask.
    """
    kept: list[int] = []
    for _, group in polls.groupby(["house", polls["regions"].map(frozenset)], sort=False):
        last = pd.Timestamp.min
        for index, start, end in group.sort_values(["end", "start"])[["start", "end"]].itertuples():
            if start > last:
                kept.append(index)
                last = end
    return polls.loc[sorted(kept)]


def window_of_row(rows: pd.DataFrame) -> np.ndarray:
    """Number of the window each row falls in, dims (row): a window opens with the first row outside the last.

    Windows depend on days of fieldwork alone, never on figures.
    """
    middle = rows["start"] + (rows["end"] - rows["start"]) / 2
    window = np.zeros(len(rows), dtype=int)
    opened, number = None, -1
    for place in np.argsort(middle.to_numpy(), kind="stable"):
        day = middle.iloc[place]
        if opened is None or (day - opened).days >= WINDOW_DAYS:
            opened, number = day, number + 1
        window[place] = number
    return window
