"""A table as its file shows it: a header and rows of cells, nothing interpreted yet."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date

from aggregator.inputs.close_spelling import close_spelling, did_you_mean
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem

# Text from any file; numbers and dates only from a workbook, where the file itself says what they are.
type Cell = str | float | bool | date


@dataclass(frozen=True, slots=True)
class SheetRow:
    """One row: its number as a spreadsheet counts it, and its filled cells by column."""

    number: int
    cells: Mapping[str, Cell]


@dataclass(frozen=True, slots=True)
class SheetTable:
    """A file's header and its rows; blank rows are gone, blank cells are absent from their row."""

    file: str
    columns: tuple[str, ...]
    rows: tuple[SheetRow, ...]


def as_text(cell: Cell) -> str:
    """Write a cell as the reader of the file would write it (a whole number without a decimal point)."""
    if isinstance(cell, bool):
        return "TRUE" if cell else "FALSE"
    if isinstance(cell, float):
        return str(int(cell)) if cell.is_integer() else repr(cell)
    return cell.isoformat() if isinstance(cell, date) else cell


def quoted(cell: Cell) -> str:
    """Write a cell's content for a message: text in quotation marks, numbers bare, long text cut."""
    text = as_text(cell)
    if len(text) > 60:
        text = text[:57] + "…"
    return f'"{text}"' if isinstance(cell, str) else text


def build_table(
    cells: Sequence[Sequence[Cell]], *, file: str, check_width: bool, columns: Collection[str]
) -> tuple[SheetTable | None, list[Problem]]:
    """Make a table of raw rows, blank ones included.

    Parameters
    ----------
    cells
        All rows of the file in order; the first one that is not blank is the header.
    check_width
        Whether a row must have as many cells as the header (a text file), or is padded by its
        program (a workbook).
    columns
        Names of known columns.

    Returns
    -------
    The table, None where its header cannot be used, and what was found wrong.
    """
    numbered = [(i, row) for i, row in enumerate(cells, start=1) if any(c != "" for c in row)]
    if not numbered:
        found = Problem(
            file, None, None, "an empty file", "a header and at least one row",
            "Fill in the table, or restore the file.", Rule.TABLE_EMPTY,
        )  # fmt: skip
        return None, [found]
    (header_row, header_cells), body = numbered[0], numbered[1:]
    header = [as_text(c) for c in header_cells]
    while header and header[-1] == "":
        header.pop()
    below = None if any(c in columns for c in header) else _header_below(body, columns)
    if below is not None:
        return None, [_title_above(file, header_row, header[0], below)]
    problems = _check_header(header, body=body, file=file, row=header_row)
    if problems:
        return None, problems
    rows = []
    for number, row in body:
        width = len(row)
        while width > len(header) and row[width - 1] == "":
            width -= 1
        # A text row one cell too long may end in blanks and hide that its cells have moved by one.
        if width > len(header) or (check_width and len(row) not in (len(header), len(header_cells))):
            problems.append(_wrong_width(file, number, width=len(row), expected=len(header)))
            continue
        rows.append(
            SheetRow(number, {c: v for c, v in zip(header, row, strict=False) if c != "" and v != ""})
        )
    return SheetTable(file, tuple(c for c in header if c), tuple(rows)), problems


# A title and a remark or two stand above a header, not a screenful.
_TITLE_ROWS = 20


def _header_below(body: list[tuple[int, Sequence[Cell]]], columns: Collection[str]) -> int | None:
    """Find the row that looks like a header where the first one does not."""
    return next((n for n, row in body[:_TITLE_ROWS] if sum(c in columns for c in row) >= 2), None)


def _title_above(file: str, row: int, title: str, header_row: int) -> Problem:
    return Problem(
        file, row, None, f"{quoted(title)} above the header, which is row {header_row}",
        "the header in the first row", "Delete the rows above it.", Rule.HEADER,
    )  # fmt: skip


def _check_header(
    header: list[str], *, body: list[tuple[int, Sequence[Cell]]], file: str, row: int
) -> list[Problem]:
    problems = []
    for place, name in enumerate(header):
        if name == "" and any(len(r) > place and r[place] != "" for _, r in body):
            problems.append(
                Problem(
                    file, row, None, f"no name above column {place + 1}, which is filled in",
                    "a name in every column", "Name the column, or empty it.", Rule.HEADER,
                )
            )  # fmt: skip
        elif name != "" and name in header[:place]:
            problems.append(
                Problem(
                    file, row, name, f"the name twice (columns {header.index(name) + 1} and {place + 1})",
                    "each column once", "Delete or rename one of the two.", Rule.HEADER,
                )
            )  # fmt: skip
    return problems


def _wrong_width(file: str, row: int, *, width: int, expected: int) -> Problem:
    if width > expected:
        remedy = (
            "Put cells that hold the separator into quotation marks "
            '("34,5"), or save the file with another separator.'
        )
    else:
        remedy = "Add the missing separators: a blank cell has a meaning here, a missing one has none."
    return Problem(
        file, row, None, f"{width} cells", f"{expected} cells, as in the header", remedy, Rule.TABLE_SHAPE
    )


def check_columns(
    table: SheetTable,
    *,
    known: Iterable[str],
    needed: Iterable[str],
    names: Mapping[str, str],
    unknown_remedy: str,
) -> list[Problem]:
    """Report columns no one knows and needed ones that are missing.

    Parameters
    ----------
    names
        Full names of known columns, by column.
    """
    known = list(known)
    problems = [
        Problem(
            table.file, 1, column, "a column of this name", "a known column",
            f"{did_you_mean(column, known, names=names)} {unknown_remedy}".strip(), Rule.COLUMN_UNKNOWN,
        )
        for column in table.columns
        if column not in known
    ]  # fmt: skip
    meant = {close_spelling(c, known) for c in table.columns if c not in known}
    problems += [
        Problem(
            table.file, 1, column, "no such column", "a column of this name",
            f"Add the column {column} to the header and fill it in.", Rule.COLUMN_NEEDED,
        )
        for column in needed
        if column not in table.columns and column not in meant
    ]  # fmt: skip
    return problems
