"""The tables of the page: rows of the release's tables, put side by side and worded for reading."""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass
from typing import Any

import pandas as pd

from aggregator.release.contents import ReleaseContents
from aggregator.release.rounding import (
    chance_text,
    date_text,
    share_interval_text,
    share_text,
    whole_text,
)
from aggregator.release.table_rows import largest_code, last_row
from aggregator.release.table_words import Kind, Level
from aggregator.seats.majorities import Outcome

WORTH_AGES = (0, 7, 14, 30, 60, 90)
RECENT_POLLS = 10
STATEMENTS = (Kind.ON_DATE, Kind.ON_POLLING_DAY)
SMALLEST_SHOWN = 0.01
"""Chances below this are not listed on the page: there are many of them, and they say one thing."""


@dataclass(frozen=True)
class PageTable:
    """A table as text.

    Attributes
    ----------
    caption
        What it shows.
    header
        Column headings; the first column heads its rows.
    rows
        Cells as text, one tuple per row; a second line of a cell, after a line break, is set smaller.
    words
        Places of the columns that hold words and so stand at the left; all others hold numbers.
    """

    caption: str
    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    words: frozenset[int] = frozenset({0})


def support_table(contents: ReleaseContents) -> PageTable:
    """Set out support of every code in the country, on the day of the run and on polling day."""
    rows = contents.tables.support
    country = rows[rows["region"] == ""]
    body = [
        (
            code.name,
            *(_share_over_interval(last_row(country, code=code.code, kind=kind)) for kind in STATEMENTS),
        )
        for code in contents.codes
    ]
    return PageTable(
        "Support in the country, percent of the vote: mean, and 90 % interval below it. "
        "An alliance is the sum of its members.",
        two_statements(contents),
        tuple(body),
    )


def two_statements(contents: ReleaseContents) -> tuple[str, ...]:
    """Head the columns of a table that sets the two statements side by side."""
    return (
        "",
        f"If people voted on {date_text(contents.run_date)}",
        f"On polling day, {date_text(contents.contest.last_polling_day)}",
    )


def regions_table(contents: ReleaseContents) -> PageTable | None:
    """Set out support on polling day in every region; None where the contest has none."""
    if not contents.contest.regions:
        return None
    final = contents.tables.support[contents.tables.support["kind"] == Kind.ON_POLLING_DAY]
    codes = [code for code in contents.codes if code.level is not Level.ALLIANCE]
    counted = contents.inputs.counted_result
    known = set() if counted is None else set(counted["region"])
    body = []
    for region in contents.contest.regions:
        here = final[final["region"] == region.code]
        rows = [last_row(here, code=code.code, kind=Kind.ON_POLLING_DAY) for code in codes]
        cell = _counted_share if region.code in known else _share_over_interval
        body.append((region.name, *(cell(row) for row in rows)))
    return PageTable(
        "Support on polling day by region, percent of the vote: mean, and 90 % interval below it. "
        "A dash: does not stand there." + (" Counted: the region's result." if known else ""),
        ("Region", *(code.name for code in codes)),
        tuple(body),
    )


OUTCOME_WORDS = {
    Outcome.MOST_SUPPORT: "has the most votes",
    Outcome.LARGEST: "has the most seats",
    Outcome.MAJORITY_ALONE: "has a majority alone",
    Outcome.MAJORITY_ONLY_AS_ALLIANCE: "has a majority together, no member alone",
    Outcome.NO_MAJORITY: "Neither a party nor an alliance has a majority",
}


def chances_table(contents: ReleaseContents) -> PageTable:
    """Set out chances on polling day in the words of the IPCC; those below 1 % are left to the CSV file."""
    chances = contents.tables.chances
    final = chances[(chances["kind"] == Kind.ON_POLLING_DAY) & (chances["probability"] >= SMALLEST_SHOWN)]
    body = []
    for outcome in Outcome:
        rows = final[final["outcome"] == outcome].sort_values("probability", ascending=False, kind="stable")
        body += [
            (
                f"{contents.names.get(row['code'], '')} {OUTCOME_WORDS[outcome]}".strip(),
                chance_text(row["probability"]),
                row["likelihood"],
            )
            for row in rows.to_dict("records")
        ]
    return PageTable(
        "Chances on polling day. Chances below 1 % are in chances.csv. Words: likelihood scale of the IPCC.",
        ("Outcome", "Chance", "In words"),
        tuple(body),
        words=frozenset({0, 2}),
    )


def worth_table(contents: ReleaseContents) -> PageTable:
    """Set out what a poll of 1,000 is worth at some ages, for the party with most support."""
    code = largest_code(contents.tables.support, kind=Kind.ON_DATE)
    table = contents.tables.shelf_life
    rows = table[(table["code"] == code) & table["age_days"].isin(WORTH_AGES)].to_dict("records")
    errors = ("expected_error", "error_sampling", "error_house", "error_shared_lean", "error_drift")
    body = tuple(
        (
            f"{whole_text(row['age_days'])} days",
            _worth_over_interval(row, "worth_today"),
            _worth_over_interval(row, "worth_polling_day"),
            *(share_text(row[error], unit=False) for error in errors),
        )
        for row in rows
    )
    return PageTable(
        f"A poll of 1,000 by a typical house, by its age on {date_text(contents.run_date)}, for "
        f"{contents.names[code]}: the respondents it is worth on that day and for polling day, 90 % "
        "intervals below. Then the error, in points, to expect of the poll's own figure against the result, "
        f"and its parts, which add up in squares; drift covers the poll's age and {_days_left(contents)}.",
        ("Age", "Worth now", "Worth for polling day", "Error", "Sampling", "House", "Shared lean", "Drift"),
        body,
    )


def _days_left(contents: ReleaseContents) -> str:
    days = max((contents.contest.last_polling_day - contents.run_date).days, 0)
    return f"the {days} day{'' if days == 1 else 's'} left to polling day"


def _worth_over_interval(row: dict[Hashable, Any], name: str) -> str:
    return f"{whole_text(row[name])}\n{whole_interval(row[f'{name}_q05'], row[f'{name}_q95'])}"


def polls_tables(contents: ReleaseContents) -> tuple[PageTable, PageTable | None]:
    """Disclose the polls used, latest first: the latest, then the others (None where there are no more)."""
    polls = contents.tables.polls_used.sort_values("end", ascending=False, kind="stable")
    header = (
        "Poll",
        "House",
        "Paid for by",
        "Fieldwork",
        "Published",
        "Regions",
        "Sample",
        "Counted",
        "How and whom",
        "Worth now",
        "Source",
    )
    body = tuple(_poll_cells(row) for _, row in polls.iterrows())
    words = frozenset({0, 1, 2, 3, 4, 5, 8, 10})
    latest = PageTable("The latest polls.", header, body[:RECENT_POLLS], words)
    older = (
        PageTable("All other polls.", header, body[RECENT_POLLS:], words)
        if len(body) > RECENT_POLLS
        else None
    )
    return latest, older


def _poll_cells(row: pd.Series) -> tuple[str, ...]:
    return (
        plain_text(row["poll"]),
        plain_text(row["house"]),
        plain_text(row["sponsor"]) or "–",
        fieldwork_text(row["start"], row["end"]),
        "–" if pd.isna(row["published"]) else fieldwork_text(row["published"], row["published"]),
        plain_text(row["regions"]) or "all",
        "–" if pd.isna(row["sample"]) else whole_text(row["sample"]),
        whole_text(row["respondents"]),
        ", ".join(part for part in (_words(row["mode"]), _words(row["population"])) if part) or "–",
        "–" if pd.isna(row["worth_today"]) else whole_text(row["worth_today"]),
        plain_text(row["source"]) or "–",
    )


def fieldwork_text(start: pd.Timestamp, end: pd.Timestamp) -> str:
    """Write days of fieldwork in little room: ``5–10 Apr 2026``."""
    last = f"{end.day} {end:%b %Y}"
    if pd.isna(start) or start == end:
        return last
    if (start.year, start.month) == (end.year, end.month):
        return f"{start.day}–{last}"
    return f"{start.day} {start:%b}{f' {start.year}' if start.year != end.year else ''} – {last}"


def _words(cell: object) -> str:
    return plain_text(cell).replace("_", " ")


def plain_text(cell: object) -> str:
    """Text of a cell; none for a blank one."""
    return "" if cell is None or (isinstance(cell, float) and cell != cell) else str(cell)


def _share_over_interval(row: pd.Series | None) -> str:
    return "–" if row is None else f"{share_text(row['mean'])}\n{share_interval_text(row['q05'], row['q95'])}"


def _counted_share(row: pd.Series | None) -> str:
    return "–" if row is None else f"{share_text(row['mean'])}\ncounted"


def whole_interval(low: float, high: float) -> str:
    """Write an interval of counts, such as ``12 to 19``."""
    return f"{whole_text(low)} to {whole_text(high)}"
