"""The record of earlier elections: what the last polls said on average, and what came out."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date

import pandas as pd

from aggregator.inputs.cell_dates import read_dates
from aggregator.inputs.cell_numbers import NumberKind, read_numbers
from aggregator.inputs.close_spelling import close_spelling
from aggregator.inputs.contest import Contest
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import RECORD_COLUMNS, RECORD_NEEDED
from aggregator.inputs.sheet_table import SheetTable, as_text, check_columns
from aggregator.problems import Problem, Severity

# Shares of one election that are rounded sum to hardly more than this.
HIGHEST_SUM = 100.5

# Whole polling averages have hardly ever missed by more; a figure in the wrong row easily does.
LARGEST_USUAL_ERROR = 20.0

_FIGURES = ("polled", "result")
_BLANK = {
    "election": ("the day of the election, like 2027-05-16", "Enter it in every row."),
    "code": ("a party's code", "Name the party, also one that is no more."),
    "polled": ("the average of the last polls, in percent", "Enter it, or leave the row out."),
    "result": ("the share of the votes, in percent", "Enter it, or leave the row out."),
}


@dataclass(frozen=True)
class _Row:
    """One row of the record whose cells could all be read."""

    row: int
    election: date
    code: str
    polled: float
    result: float


def read_past_errors(table: SheetTable, *, contest: Contest) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read the record of earlier elections.

    Returns
    -------
    Columns ``election`` (``datetime64``), ``code``, ``polled``, ``result`` (percent), in the order of the
    file; None where something is wrong. And what was found.
    """
    problems = check_columns(
        table,
        known=RECORD_COLUMNS,
        needed=RECORD_NEEDED,
        names={},
        unknown_remedy="Parties stand in rows, one per election and party; remarks belong in note.",
    )
    if not table.rows:
        problems.append(
            Problem(
                table.file, None, None, "a header and no row", "one row per election and party",
                "Enter the record, or move the file out of the folder.", Rule.TABLE_EMPTY,
            )
        )  # fmt: skip
    if any(column not in table.columns for column in RECORD_NEEDED):
        return None, problems
    rows, found = _read_rows(table)
    problems += found
    problems += _check_elections(rows, table.file, contest)
    problems += _check_fractions(rows, table.file)
    if any(p.severity is Severity.ERROR for p in problems):
        return None, problems
    problems += _check_codes(rows, table.file, contest)
    problems += _check_figures(rows, table.file)
    frame = pd.DataFrame([{c: getattr(row, c) for c in RECORD_NEEDED} for row in rows])
    frame["election"] = pd.to_datetime(frame["election"]).astype("datetime64[ns]")
    return frame, problems


def past_errors_as_of(record: pd.DataFrame | None, *, day: date) -> pd.DataFrame | None:
    """Keep elections that were over by a day; None where there are none."""
    if record is None:
        return None
    kept = record[record["election"] <= pd.Timestamp(day)].reset_index(drop=True)
    return None if kept.empty else kept


def _read_rows(table: SheetTable) -> tuple[list[_Row], list[Problem]]:
    numbers, problems = read_numbers(table, kinds=dict.fromkeys(_FIGURES, NumberKind.PERCENT))
    days, more = read_dates(table, columns=("election",))
    problems += more
    rows = []
    for row in table.rows:
        for column, (expected, remedy) in _BLANK.items():
            if column not in row.cells:
                problems.append(
                    Problem(
                        table.file, row.number, column, "a blank cell", expected, remedy, Rule.CELL_NEEDED
                    )
                )
        figures = [numbers.get((row.number, column)) for column in _FIGURES]
        for column, value in zip(_FIGURES, figures, strict=True):
            if value is not None and not 0 <= value <= 100:
                problems.append(
                    Problem(
                        table.file, row.number, column, f"{value:g}", "a percentage from 0 to 100",
                        "Correct the figure; votes are entered as percentages here.", Rule.SHARE_RANGE,
                    )
                )  # fmt: skip
        election, code = days.get((row.number, "election")), as_text(row.cells.get("code", ""))
        polled, result = figures
        if election is not None and code and polled is not None and result is not None:
            rows.append(_Row(row.number, election, code, polled, result))
    return rows, problems


def _check_elections(rows: list[_Row], file: str, contest: Contest) -> Iterator[Problem]:
    polling_day = min(contest.polling_day_of(r) for r in contest.region_codes)
    first: dict[tuple[date, str], int] = {}
    for row in rows:
        if row.election >= polling_day:
            yield Problem(
                file, row.row, "election", row.election.isoformat(),
                f"a day before polling day ({polling_day})",
                "Correct the year, or leave the row out.", Rule.PAST_ELECTION,
            )  # fmt: skip
        earlier = first.setdefault((row.election, row.code), row.row)
        if earlier != row.row:
            yield Problem(
                file, row.row, "code", f'"{row.code}" for {row.election}, already in row {earlier}',
                "each party once an election", "Delete one of the two.", Rule.PAST_TWICE,
            )  # fmt: skip


def _check_fractions(rows: list[_Row], file: str) -> Iterator[Problem]:
    if rows and max(max(row.polled, row.result) for row in rows) <= 1:
        yield Problem(
            file, None, None, "no figure above 1", "percentages",
            "Multiply the figures by 100; a workbook's percent format stores 0.34 for 34 %.",
            Rule.SHARE_FRACTION,
        )  # fmt: skip


def _check_codes(rows: list[_Row], file: str, contest: Contest) -> Iterator[Problem]:
    first = {row.code: row.row for row in reversed(rows) if row.code not in contest.party_codes}
    elections: dict[str, set[date]] = {}
    for row in rows:
        elections.setdefault(row.code, set()).add(row.election)
    gone = []
    for code in sorted(first, key=lambda c: first[c]):
        near = close_spelling(code, contest.party_codes)
        # Whoever has a row of its own in the same election is another party.
        if near is None or elections[code] & elections.get(near, set()):
            gone.append(code)
            continue
        yield _no_party(file, first[code], f'"{code}"', f'If "{near}" is meant, correct it.')
    if gone:
        more = f", … ({len(gone)} in total)" if len(gone) > 5 else ""
        found = ", ".join(f'"{code}" (row {first[code]})' for code in gone[:5]) + more
        yield _no_party(file, first[gone[0]], found, "")


def _no_party(file: str, row: int, found: str, remedy: str) -> Problem:
    kept = "The rows teach how large errors are, and nothing about a party of today."
    return Problem(
        file, row, "code", found, "a party of this contest", f"{remedy} {kept}".strip(), Rule.PAST_CODE,
        Severity.WARNING,
    )  # fmt: skip


def _check_figures(rows: list[_Row], file: str) -> Iterator[Problem]:
    elections: dict[date, list[_Row]] = {}
    for row in rows:
        elections.setdefault(row.election, []).append(row)
        if abs(row.polled - row.result) > LARGEST_USUAL_ERROR:
            yield Problem(
                file, row.row, "polled", f"{row.polled:g} for a result of {row.result:g}",
                f"figures within {LARGEST_USUAL_ERROR:g} points of each other",
                "Check both: a slip here widens every interval.", Rule.PAST_APART, Severity.WARNING,
            )  # fmt: skip
    for election, group in elections.items():
        for column in _FIGURES:
            total = sum(getattr(row, column) for row in group)
            if total > HIGHEST_SUM:
                yield Problem(
                    file, group[0].row, column, f"figures for {election} that sum to {total:.6g}",
                    f"at most {HIGHEST_SUM:g}", "Look for a slip, or for an alliance beside its members.",
                    Rule.PAST_SUM, Severity.WARNING,
                )  # fmt: skip
        if len(group) == 1:
            yield Problem(
                file, group[0].row, "election", f"{election} in one row only", "two parties or more",
                "Add the other parties: one alone says little about the error all houses shared.",
                Rule.PAST_ALONE, Severity.WARNING,
            )  # fmt: skip
