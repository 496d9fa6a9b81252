"""A CSV file or a workbook, read into cells: encodings, separators, line ends, sheets."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Collection

from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.sheet_table import Cell, SheetTable, build_table
from aggregator.inputs.workbook_cells import read_workbook_cells
from aggregator.problems import Problem, Severity

SEPARATORS = {",": "comma", ";": "semicolon", "\t": "tab"}

# A word with a letter beyond ASCII, by which a reader sees whether the encoding was guessed right.
_FOREIGN_WORD = re.compile(r"[\w.-]*[^\x00-\x7f][\w.-]*")

# str.strip() already takes no-break spaces; these two are invisible and are left behind by copying.
_INVISIBLE = "\ufeff\u200b"


def read_table(
    data: bytes, *, file: str, sheet: str, columns: Collection[str]
) -> tuple[SheetTable | None, list[Problem]]:
    """Read a table from the bytes of a file.

    Parameters
    ----------
    data
        The file's bytes.
    file
        Its name; the ending says whether it is a workbook (``.xlsx``) or text (``.csv``).
    sheet
        The sheet to take where a workbook has several.
    columns
        Names of known columns, by which a header below a title is recognised.

    Returns
    -------
    The table, None where nothing can be read, and what was found wrong or doubtful.
    """
    if file.casefold().endswith(".xlsx"):
        cells, problems = read_workbook_cells(data, file=file, sheet=sheet)
        check_width = False
    else:
        cells, problems = _read_text_cells(data, file=file)
        check_width = True
    if cells is None:
        return None, problems
    table, more = build_table(cells, file=file, check_width=check_width, columns=columns)
    return table, problems + more


def decode_text(data: bytes, *, file: str) -> tuple[str | None, list[Problem]]:
    """Decode a text file: UTF-8, UTF-16 with its mark, or Windows-1252, the last with a warning."""
    if data[:2] == b"PK":
        return None, [
            Problem(
                file, None, None, "a workbook under a text file's name", "text",
                "Name it .xlsx, or save it as CSV.", Rule.FILE_READABLE,
            )
        ]  # fmt: skip
    marked_utf16 = data[:2] in (b"\xff\xfe", b"\xfe\xff")
    if b"\x00" in data and not marked_utf16:
        return None, [_not_text(file)]
    try:
        return data.decode("utf-16" if marked_utf16 else "utf-8-sig"), []
    except UnicodeDecodeError:
        pass
    try:
        text = data.decode("cp1252")
    except UnicodeDecodeError:
        return None, [_not_text(file)]
    row, line = next((i, s) for i, s in enumerate(re.split("\r\n|\r|\n", text), start=1) if not s.isascii())
    word = _FOREIGN_WORD.findall(line)[0]
    warning = Problem(
        file, row, None, f'text that is not UTF-8; read as Windows-1252 ("{word}")', "UTF-8",
        "Check that the word is right, and save the file as CSV UTF-8.", Rule.FILE_ENCODING, Severity.WARNING,
    )  # fmt: skip
    return text, [warning]


def _not_text(file: str) -> Problem:
    return Problem(
        file, None, None, "bytes that are not text", "a text file in UTF-8",
        "Save the file again as CSV UTF-8.", Rule.FILE_READABLE,
    )  # fmt: skip


def _read_text_cells(data: bytes, *, file: str) -> tuple[list[list[Cell]] | None, list[Problem]]:
    text, problems = decode_text(data, file=file)
    if text is None:
        return None, problems
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    # Spreadsheet programs may write a first line "sep=;": it counts as a row but is no header.
    declared = text[4] if text[:4].casefold() == "sep=" and text[4:5] in SEPARATORS else None
    skipped = 1 if declared else 0
    if not text.strip(_INVISIBLE + " ,;\t\n"):
        return [], problems
    separator = declared or _separator(text)
    if separator is None:
        problems.append(
            Problem(
                file, 1, None, "a header of a single cell", "column names divided by comma, semicolon or tab",
                "Save the file again as CSV UTF-8.", Rule.TABLE_SHAPE,
            )
        )  # fmt: skip
        return None, problems
    cells: list[list[Cell]] = []
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=separator, strict=True)
    try:
        for row in reader:
            cells.append([c.strip().strip(_INVISIBLE).strip() for c in row])
    except csv.Error as error:
        problems.append(
            Problem(
                file, len(cells) + 1, None, f"quotation marks that do not pair ({error})",
                "each quoted cell closed by a quotation mark",
                "Close or remove the quotation mark; one inside a cell is written twice.", Rule.FILE_READABLE,
            )
        )  # fmt: skip
        return None, problems
    for i in range(skipped):
        cells[i] = []
    return cells, problems


def _separator(text: str) -> str | None:
    """Find the separator that divides the header into the most cells; None where none divides it."""
    header = next((line for line in text.split("\n") if line.strip(" ,;\t\ufeff")), "")
    counts = {s: len(next(csv.reader([header], delimiter=s))) for s in SEPARATORS}
    best = max(counts, key=lambda s: counts[s])
    return best if counts[best] > 1 else None
