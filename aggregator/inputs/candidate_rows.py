"""Who stands where: the rows of the list of candidates, each by itself."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from enum import StrEnum

import pandas as pd

from aggregator.inputs.cell_dates import read_dates
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import CANDIDATE_COLUMNS, CANDIDATE_NEEDED, Candidacy, Use
from aggregator.inputs.sheet_table import SheetRow, SheetTable, as_text, check_columns, quoted
from aggregator.problems import Problem

# Columns of the table of those who stand.
STANDING_COLUMNS = ("seat", "code", "name", "holder")

_BLANK = {
    "seat": ("a seat of the last result", "Enter the label that the seat has there."),
    "code": ("a party's code", "Enter the party of the candidate, OTH for one of any other."),
}


@dataclass(frozen=True)
class CandidateRow:
    """One row of the list; cells that could not be read are as if blank.

    Attributes
    ----------
    status_date
        The day from which the candidate is withdrawn, or stands; None where blank: stands all along.
    """

    row: int
    seat: str
    code: str
    name: str
    holder: bool
    withdrawn: bool
    status_date: date | None

    @property
    def since(self) -> date:
        """The first day on which the candidate is known to stand."""
        return date.min if self.withdrawn or self.status_date is None else self.status_date

    @property
    def until(self) -> date:
        """The day of the withdrawal, on which the candidate stands no more; far off without one."""
        if not self.withdrawn:
            return date.max
        return date.min if self.status_date is None else self.status_date

    def stands_on(self, day: date) -> bool:
        """Tell whether the candidate stands at the end of a day, as far as was known then."""
        return self.since <= day < self.until

    def meets(self, other: CandidateRow) -> bool:
        """Tell whether two candidates stand on some day together."""
        return max(self.since, other.since) < min(self.until, other.until)


def read_candidate_rows(table: SheetTable) -> tuple[tuple[CandidateRow, ...], list[Problem]]:
    """Read the rows one by one.

    Returns
    -------
    The rows in the order of the file, none where a column is missing that cannot be, and what was found.
    """
    problems = check_columns(
        table,
        known=CANDIDATE_COLUMNS,
        needed=CANDIDATE_NEEDED,
        names={},
        unknown_remedy="Candidates stand in rows, each with seat and code; remarks belong in note.",
    )
    if not table.rows:
        problems.append(
            Problem(
                table.file, None, None, "a header and no row", "one row per candidate",
                "Enter the candidates, or move the file out of the folder.", Rule.TABLE_EMPTY,
            )
        )  # fmt: skip
    if any(column not in table.columns for column in CANDIDATE_NEEDED):
        return (), problems
    days, more = read_dates(table, columns=("status_date",))
    problems += more
    rows = []
    for sheet_row in table.rows:
        row, more = _read_row(sheet_row, day=days.get((sheet_row.number, "status_date")), file=table.file)
        problems += more
        rows.append(row)
    return tuple(rows), problems


def _read_row(sheet_row: SheetRow, *, day: date | None, file: str) -> tuple[CandidateRow, list[Problem]]:
    number, cells = sheet_row.number, sheet_row.cells
    holder, problems = _read_word(sheet_row, "holder", Use, file)
    status, more = _read_word(sheet_row, "status", Candidacy, file)
    problems += more
    for column, (expected, remedy) in _BLANK.items():
        if column not in cells:
            problems.append(Problem(file, number, column, "a blank cell", expected, remedy, Rule.CELL_NEEDED))
    if status == Candidacy.WITHDRAWN and "status_date" not in cells:
        problems.append(
            Problem(
                file, number, "status_date", "a blank cell beside status = withdrawn",
                "the day it was made known",
                "Enter it: a run as of an earlier day still counts the candidate.", Rule.CANDIDATE_DAY,
            )
        )  # fmt: skip
    seat, code, name = (as_text(cells.get(column, "")) for column in ("seat", "code", "name"))
    return (
        CandidateRow(
            row=number,
            seat=seat,
            code=code,
            name=name,
            holder=holder == Use.YES,
            withdrawn=status == Candidacy.WITHDRAWN,
            status_date=day,
        ),
        problems,
    )


def _read_word(
    row: SheetRow, column: str, closed: type[StrEnum], file: str
) -> tuple[StrEnum | None, list[Problem]]:
    """Read a cell that holds one of a few words, None where it is blank or holds another."""
    if column not in row.cells:
        return None, []
    word = as_text(row.cells[column]).casefold()
    if word in list(closed):
        return closed(word), []
    return None, [
        Problem(
            file, row.number, column, quoted(row.cells[column]), f"one of {', '.join(closed)}, or blank",
            f"Write {' or '.join(closed)}.", Rule.WORD,
        )
    ]  # fmt: skip


def standing_on(rows: tuple[CandidateRow, ...], *, day: date) -> pd.DataFrame | None:
    """Build the table of those who stand on a day, in the order of the file; None where nobody does."""
    frame = pd.DataFrame(
        [[getattr(row, column) for column in STANDING_COLUMNS] for row in rows if row.stands_on(day)],
        columns=list(STANDING_COLUMNS),
    )
    return None if frame.empty else frame.astype({"holder": bool})
