"""The register as screens look at it: rows with shares, whole polls, and polls that share no interviews."""

from __future__ import annotations

from collections.abc import Sequence

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
    rows = []
    for name, group in polls.groupby("poll", sort=False):
        first = group.iloc[0]
        asked = frozenset().union(*group["regions"])
        whole = [set(where) == set(regions) for where in group["regions"]]
        start, end = group["start"].min(), group["end"].max()
        rows.append(
            {
                "poll": str(name),
                "house": first["house"],
                "mode": first["mode"],
                "start": start,
                "end": end,
                "published": group["published"].max(),
                "days": (end - start).days + 1,
                "sample": float(group.loc[whole, "sample"].iloc[0] if any(whole) else group["sample"].sum()),
                "regions": asked,
                "kind": "national" if asked == set(regions) else "regional",
            }
        )
    return pd.DataFrame(rows)


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
