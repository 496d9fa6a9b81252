"""Typed rows into the tables that leave this room."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from datetime import date

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.poll_shares import SharesOfRow

_PLAIN = ("row", "poll", "house", "sponsor", "start", "end", "published", "regions", "sample")
_LABELS = ("mode", "population", "method")
_DAYS = ("start", "end", "published")


def build_polls(
    rows: Sequence[PollRow],
    *,
    shares: Mapping[int, SharesOfRow],
    kept: Mapping[str, float],
    contest: Contest,
) -> pd.DataFrame:
    """Build the table of rows that enter the fit (its columns: :class:`DeskInputs`).

    Parameters
    ----------
    shares
        Shares by row number.
    kept
        Part of a poll's respondents (0–1) that no earlier poll of its series has, by poll.
    """
    records = []
    for row in rows:
        read = shares[row.row]
        part = read.decided * kept.get(row.poll, 1.0)
        record = {name: getattr(row, name) for name in (*_PLAIN, *_LABELS, "source", "note")}
        record |= {
            "respondents": (row.sample or math.nan) * part,
            "effective": math.nan if row.effective is None else row.effective * part,
            "undecided": math.nan if row.undecided is None else row.undecided,
            "rounding_step": read.step,
            "remainder": read.remainder,
        }
        record |= {code: read.shares.get(code, math.nan) for code in contest.column_codes}
        records.append(record)
    columns = [
        *_PLAIN, "respondents", "effective", *_LABELS, "undecided", "rounding_step", "source", "note",
        *contest.column_codes, "remainder",
    ]  # fmt: skip
    frame = _with_days(pd.DataFrame(records, columns=columns), _DAYS)
    whole = frame.groupby("poll")["respondents"].transform("sum")
    frame.insert(list(frame.columns).index("respondents") + 1, "poll_respondents", whole)
    return frame


def build_unused(unused: Sequence[tuple[PollRow, str]], *, contest: Contest) -> pd.DataFrame:
    """Build the table of rows that do not enter, as read, with the reason."""
    labels = ("question", *_LABELS, "undecided", "status", "status_date", "replaces", "source", "note")
    records = []
    for row, reason in unused:
        record = {name: getattr(row, name) for name in (*_PLAIN, "effective", *labels)}
        record |= {"question": row.question.value, "status": row.status.value, "why_not": reason}
        record |= {code: row.shares.get(code, math.nan) for code in contest.column_codes}
        records.append(record)
    columns = [*_PLAIN, "effective", *labels, *contest.column_codes, "why_not"]
    frame = _with_days(pd.DataFrame(records, columns=columns), (*_DAYS, "status_date"))
    numbers = ["sample", "effective", "undecided", *contest.column_codes]
    return frame.astype(dict.fromkeys(numbers, float))


def _with_days(frame: pd.DataFrame, columns: Sequence[str]) -> pd.DataFrame:
    for column in columns:
        stamps = [math.nan if not isinstance(d, date) else d for d in frame[column]]
        frame[column] = pd.to_datetime(pd.Series(stamps, dtype=object)).astype("datetime64[ns]")
    return frame
