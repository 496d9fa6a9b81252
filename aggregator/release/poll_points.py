"""The published figures behind the curves, as points."""

from __future__ import annotations

from collections.abc import Sequence

import pandas as pd

from aggregator.inputs.desk_inputs import DeskInputs


def build_poll_points(inputs: DeskInputs, *, codes: Sequence[str]) -> pd.DataFrame:
    """Each national row's figure for each code it names on its own.

    Parameters
    ----------
    inputs
        Holds the rows in the fit.
    codes
        Codes wanted; a code without a column has no points.

    Returns
    -------
    pandas.DataFrame
        Columns ``date`` (middle of the fieldwork), ``code``, ``value`` (percent, the undecided set aside),
        ``house``.
    """
    polls = inputs.polls
    everywhere = set(inputs.contest.region_codes)
    national = polls[[set(regions) == everywhere for regions in polls["regions"]]]
    middle = national["start"].fillna(national["end"])
    middle = middle + (national["end"] - middle) / 2
    parts = [
        pd.DataFrame(
            {"date": middle, "code": code, "value": national[code].astype(float), "house": national["house"]}
        )
        for code in codes
        if code in national.columns
    ]
    if not parts:
        return pd.DataFrame({"date": [], "code": [], "value": [], "house": []})
    return pd.concat(parts, ignore_index=True).dropna(subset=["value"]).reset_index(drop=True)
