"""The polls behind a release: what is disclosed of each, and what the desk alone sees."""

from __future__ import annotations

from collections.abc import Sequence

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.problems import Problem
from aggregator.release.table_schemas import POLLS_USED, POLLS_WEIGHED
from aggregator.screens.questions import screens_by_poll

REGISTER = "polls."
"""How the register's file name begins, whatever its format."""


def build_polls_used_table(
    polls: pd.DataFrame, *, polls_worth: pd.DataFrame, contest: Contest
) -> pd.DataFrame:
    """Disclosure of every poll in the fit, one row per poll, its regional rows folded into one.

    Parameters
    ----------
    polls
        Rows in the fit, as ``DeskInputs.polls`` has them.
    polls_worth
        Columns ``poll`` and ``worth_today`` (fresh respondents), one row per poll.
    contest
        Names the regions.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``POLLS_USED``, in register order.
    """
    worth = _by_poll(polls_worth, "worth_today")
    rows = [_disclose(group, contest.region_codes) for _, group in polls.groupby("poll", sort=False)]
    table = pd.DataFrame(rows, columns=list(POLLS_USED.column_names))
    table["worth_today"] = table["poll"].astype(str).map(worth).astype(float)
    for name in ("start", "end", "published"):
        table[name] = pd.to_datetime(table[name])
    return table


def _disclose(rows: pd.DataFrame, regions: Sequence[str]) -> dict[str, object]:
    """One poll's disclosure from its rows."""
    asked = [tuple(where) for where in rows["regions"]]
    national = [set(where) == set(regions) for where in asked]
    first = rows.iloc[0]
    together = [code for code in regions if any(code in where for where in asked)]
    whole = any(national) or len(together) == len(regions)
    return {
        "poll": first["poll"],
        "house": first["house"],
        "sponsor": first["sponsor"],
        "start": rows["start"].min(),
        "end": rows["end"].max(),
        "published": rows["published"].max(),
        "regions": "" if whole else "+".join(together),
        "sample": rows.loc[national, "sample"].iloc[0] if any(national) else rows["sample"].sum(),
        "respondents": first["poll_respondents"],
        "mode": first["mode"],
        "population": first["population"],
        "method": first["method"],
        "undecided": rows["undecided"].mean(),
        "source": first["source"],
    }


def build_polls_weighed_table(
    polls: pd.DataFrame,
    *,
    unused_polls: pd.DataFrame,
    polls_worth: pd.DataFrame,
    warnings: Sequence[Problem],
    screens: pd.DataFrame,
) -> pd.DataFrame:
    """Every row of the register: whether it is in the fit and why not, what it is worth, what was doubtful.

    Parameters
    ----------
    polls, unused_polls
        Rows in the fit and rows left out, as ``DeskInputs`` has them.
    polls_worth
        Columns ``poll``, ``worth_today`` and, where worked out, ``pareto_k``; one row per poll.
    warnings
        Findings of the reading; those about a row of the register are put beside it.
    screens
        Questions that polls in the fit raise, as ``screen_polls`` gives them.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``POLLS_WEIGHED``, in register order.
    """
    names = list(POLLS_WEIGHED.column_names)
    used = polls.reindex(columns=[*names]).assign(used="yes", why_not="")
    used["worth_today"] = used["poll"].astype(str).map(_by_poll(polls_worth, "worth_today")).astype(float)
    used["pareto_k"] = used["poll"].astype(str).map(_by_poll(polls_worth, "pareto_k")).astype(float)
    used["screens"] = used["poll"].astype(str).map(screens_by_poll(screens)).fillna("")
    unused = unused_polls.reindex(columns=names).assign(
        used="no", screens="", respondents=float("nan"), worth_today=float("nan"), pareto_k=float("nan")
    )
    table = pd.concat([part for part in (used, unused) if len(part)] or [used], ignore_index=True)
    for name in ("start", "end"):
        table[name] = pd.to_datetime(table[name], errors="coerce")
    notes: dict[int, list[str]] = {}
    for problem in warnings:
        if problem.file.startswith(REGISTER) and problem.row is not None:
            column = f"{problem.column}: " if problem.column else ""
            notes.setdefault(problem.row, []).append(
                f"{column}found {problem.found}; expected {problem.expected}"
            )
    table["warnings"] = ["; ".join(notes.get(int(row), [])) for row in table["row"]]
    return table[names].sort_values("row", kind="stable").reset_index(drop=True)


def _by_poll(polls_worth: pd.DataFrame, column: str) -> dict[str, float]:
    if column not in polls_worth.columns:
        return {}
    first = polls_worth.drop_duplicates("poll")
    return dict(zip(first["poll"].astype(str), first[column].astype(float), strict=True))
