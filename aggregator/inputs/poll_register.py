"""The poll register: a table of cells into typed rows, each cell checked."""

from __future__ import annotations

import re
from collections.abc import Iterator
from datetime import date
from enum import StrEnum
from typing import Any

from aggregator.inputs.cell_dates import read_dates
from aggregator.inputs.cell_numbers import NumberKind, read_numbers
from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.contest import Contest
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import (
    REGISTER_COLUMNS,
    REGISTER_DATES,
    REGISTER_NEEDED,
    Question,
    Status,
    Use,
)
from aggregator.inputs.sheet_table import SheetRow, SheetTable, as_text, check_columns, quoted
from aggregator.problems import Problem, Severity

_CLOSED_WORDS: dict[str, type[StrEnum]] = {"question": Question, "status": Status, "use": Use}


def read_poll_rows(
    table: SheetTable, *, contest: Contest
) -> tuple[list[PollRow], frozenset[str], list[Problem]]:
    """Read the register's rows.

    Returns
    -------
    The rows that can be read, in file order; the identifiers of polls with a row that cannot (nothing
    should be concluded from their other rows); and what was found wrong.
    """
    codes = [c for c in table.columns if c in contest.column_codes]
    problems = check_columns(
        table,
        known=(*REGISTER_COLUMNS, *contest.column_codes),
        needed=REGISTER_NEEDED,
        names=contest.column_names,
        unknown_remedy="A party's or alliance's column bears its code; remarks belong in note.",
    )
    if len(codes) < 2:
        problems.append(_too_few_code_columns(table, codes, contest))
    if not table.rows:
        problems.append(
            Problem(
                table.file, None, None, "a header and no row", "one poll or more", "Enter the polls.",
                Rule.TABLE_EMPTY,
            )
        )  # fmt: skip
    if any(c not in table.columns for c in REGISTER_NEEDED) or len(codes) < 2:
        return [], frozenset(), problems
    kinds = dict.fromkeys([*codes, "undecided"], NumberKind.PERCENT)
    kinds |= {"sample": NumberKind.COUNT, "effective": NumberKind.QUANTITY}
    numbers, number_problems = read_numbers(table, kinds=kinds)
    days, day_problems = read_dates(table, columns=REGISTER_DATES)
    problems += number_problems + day_problems
    problems += _check_identical(table)
    broken = {p.row for p in problems if p.row is not None and p.severity is Severity.ERROR}
    rows, broken_polls = [], set()
    for sheet_row in table.rows:
        row, found = _read_row(
            sheet_row, file=table.file, contest=contest, codes=codes, numbers=numbers, days=days
        )
        problems += found
        if row is not None and not found and row.row not in broken:
            rows.append(row)
        else:
            broken_polls.add(row.poll if row is not None else as_text(sheet_row.cells.get("poll", "")))
    return rows, frozenset(broken_polls), problems


def _too_few_code_columns(table: SheetTable, codes: list[str], contest: Contest) -> Problem:
    return Problem(
        table.file, 1, None, f"{len(codes)} column(s) headed by a party's or alliance's code",
        "two or more", f"Head the columns of shares with codes: {', '.join(contest.column_codes[:12])}.",
        Rule.TOO_FEW_CODES,
    )  # fmt: skip


def _check_identical(table: SheetTable) -> Iterator[Problem]:
    first: dict[tuple[Any, ...], int] = {}
    for row in table.rows:
        content = tuple(sorted((c, as_text(v)) for c, v in row.cells.items()))
        earlier = first.setdefault(content, row.number)
        if earlier != row.number:
            yield Problem(
                table.file, row.number, None, f"the same as row {earlier}, cell by cell", "each row once",
                "Delete one of the two.", Rule.SAME_ROW,
            )  # fmt: skip


def made_poll_id(house: str, end: date) -> str:
    """Make the identifier of a poll whose ``poll`` cell is blank: its house and its last day."""
    slug = re.sub(r"\W+", "-", house.casefold()).strip("-")
    return f"{slug}-{end.isoformat()}"


def _read_row(
    sheet_row: SheetRow,
    *,
    file: str,
    contest: Contest,
    codes: list[str],
    numbers: dict[tuple[int, str], float],
    days: dict[tuple[int, str], date],
) -> tuple[PollRow | None, list[Problem]]:
    """Read one row; None where the cells a row cannot do without are missing or unreadable."""
    number, cells = sheet_row.number, sheet_row.cells
    text = {c: as_text(cells[c]) if c in cells else "" for c in REGISTER_COLUMNS}
    problems: list[Problem] = []
    words: dict[str, Any] = {}
    for column, closed in _CLOSED_WORDS.items():
        words[column] = None
        if text[column]:
            word = text[column].casefold()
            if word in list(closed):
                words[column] = closed(word)
            else:
                problems.append(
                    Problem(
                        file, number, column, quoted(cells[column]), f"one of {', '.join(closed)}, or blank",
                        did_you_mean(word, closed) if len(closed) > 2 else "Write yes or no.", Rule.WORD,
                    )
                )  # fmt: skip
    question = words["question"] or Question.VOTE
    needed = ["house", "end"]
    if question is not Question.SEATS_ONLY and words["use"] is not Use.NO:
        needed.append("sample")
    for column in needed:
        if column not in cells:
            problems.append(
                Problem(
                    file, number, column, "a blank cell", _EXPECTED[column], _BLANK_REMEDY[column],
                    Rule.CELL_NEEDED,
                )
            )  # fmt: skip
    regions, found = _read_regions(text["region"], file=file, row=number, contest=contest)
    problems += found
    end = days.get((number, "end"))
    if end is None or not text["house"]:
        return None, problems
    row = PollRow(
        row=number,
        poll=text["poll"] or _made_id(text, end, days.get((number, "status_date"))),
        house=text["house"],
        sponsor=text["sponsor"],
        start=days.get((number, "start"), end),
        end=end,
        published=days.get((number, "published"), end),
        question=question,
        regions=regions,
        national=set(regions) == set(contest.region_codes),
        sample=numbers.get((number, "sample")),
        effective=numbers.get((number, "effective")),
        mode=text["mode"],
        population=text["population"],
        method=text["method"],
        shares={c: numbers[number, c] for c in codes if (number, c) in numbers},
        undecided=numbers.get((number, "undecided")),
        status=words["status"] or Status.FINAL,
        status_date=days.get((number, "status_date")),
        replaces=text["replaces"],
        use=words["use"],
        why_not=text["why_not"],
        source=text["source"],
        note=text["note"],
        start_given="start" in cells,
        published_given="published" in cells,
    )
    return row, problems


def _made_id(text: dict[str, str], end: date, status_date: date | None) -> str:
    made = made_poll_id(text["house"], end)
    return f"{made}-corrected-{status_date}" if text["replaces"] and status_date is not None else made


_EXPECTED = {
    "house": "the name of the polling house",
    "end": "the last day of fieldwork, like 2031-04-23",
    "sample": "a number of respondents",
}
_BLANK_REMEDY = {
    "house": "Name the house; if it is not known, leave the poll out of the register.",
    "end": "Enter the last day of fieldwork.",
    "sample": "Enter it, or leave the poll out in the open: use = no, and why_not.",
}


def _read_regions(
    text: str, *, file: str, row: int, contest: Contest
) -> tuple[tuple[str, ...], list[Problem]]:
    """Read a row's region codes in the contest's order; all of them where the cell is blank."""
    if not text:
        return contest.region_codes, []
    names = {r.code: r.name for r in contest.regions}
    known = list(names)
    named = [part.strip() for part in text.split("+")]
    problems = []
    for i, code in enumerate(named):
        if not known:
            problems.append(
                Problem(
                    file, row, "region", f'"{code}"', "a blank cell, since the contest names no region",
                    "Empty the cell, or add the [[region]] to contest.toml.", Rule.ROW_REGION,
                )
            )  # fmt: skip
        elif code not in known:
            problems.append(
                Problem(
                    file, row, "region", f'"{code}"', "region codes of the contest, joined by +, or blank",
                    f"{did_you_mean(code, known, names=names)} Blank is the whole country.", Rule.ROW_REGION,
                )
            )  # fmt: skip
        elif code in named[:i]:
            problems.append(
                Problem(
                    file, row, "region", f'"{code}" a second time', "each region once",
                    "Delete one of the two.", Rule.ROW_REGION,
                )
            )  # fmt: skip
    return tuple(c for c in contest.region_codes if c in named), problems
