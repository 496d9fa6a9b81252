"""Numbers as desks write them: decimal commas, thousands marks, percent signs.

Which mark divides the decimals is read from the whole file, never from one cell: ``34,5`` beside ``1.024``
is one way of writing, ``34.5`` beside ``1,024`` the other, and a file that mixes the two is refused.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum

from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.sheet_table import Cell, SheetTable, quoted
from aggregator.problems import Problem

_SPACES = "\u00a0\u202f\u2009 "
_APOSTROPHES = "'\u2019"


class Marks(StrEnum):
    """Which mark stands before the decimals in a file."""

    POINT = "point"
    COMMA = "comma"


class NumberKind(StrEnum):
    """What a column's numbers are."""

    PERCENT = "percent"
    COUNT = "count"
    QUANTITY = "quantity"


def _pattern(decimal: str, thousands: str) -> re.Pattern[str]:
    grouped = rf"[0-9]{{1,3}}(?:[{thousands}{_SPACES}{_APOSTROPHES}][0-9]{{3}})+"
    return re.compile(rf"(?:{grouped}|[0-9]+)(?:{decimal}[0-9]*)?|{decimal}[0-9]+")


_PATTERNS = {Marks.POINT: _pattern(r"\.", ","), Marks.COMMA: _pattern(",", r"\.")}


@dataclass(frozen=True, slots=True)
class WrittenNumber:
    """A number as text: the value under each way of writing that can read it."""

    readings: Mapping[Marks, float]

    @property
    def same_either_way(self) -> bool:
        """Whether the marks do not matter."""
        return len(set(self.readings.values())) == 1 and len(self.readings) == 2


def _readings(text: str, *, kind: NumberKind) -> WrittenNumber | None:
    """Read a text under each way of writing; None where it is no number."""
    body = text
    if kind is NumberKind.PERCENT and body.endswith("%"):
        body = body[:-1].rstrip()
    negative = body[:1] in "-\u2212" and len(body) > 1
    body = body[1:] if negative else body
    found: dict[Marks, float] = {}
    for marks, pattern in _PATTERNS.items():
        if pattern.fullmatch(body):
            thousands, decimal = (",", ".") if marks is Marks.POINT else (".", ",")
            bare = body.translate(str.maketrans("", "", thousands + _SPACES + _APOSTROPHES))
            value = float(bare.replace(decimal, "."))
            found[marks] = -value if negative else value
    if not found:
        return None
    likely = {m: v for m, v in found.items() if _plausible(v, body, marks=m, kind=kind)}
    return WrittenNumber(likely or found)


def _plausible(value: float, text: str, *, marks: Marks, kind: NumberKind) -> bool:
    """Whether a reading makes sense for the kind: no percentage of 34,567, no 1.024 respondents."""
    if kind is NumberKind.PERCENT:
        return abs(value) <= 100
    if kind is NumberKind.COUNT:
        return ("." if marks is Marks.POINT else ",") not in text
    return True


def read_numbers(
    table: SheetTable, *, kinds: Mapping[str, NumberKind]
) -> tuple[dict[tuple[int, str], float], list[Problem]]:
    """Read every filled cell of the number columns.

    Parameters
    ----------
    kinds
        What the numbers of each column are; only these columns are read.

    Returns
    -------
    Values by (row number, column), cells that cannot be read left out, and what was found wrong.
    """
    values: dict[tuple[int, str], float] = {}
    written: dict[tuple[int, str], tuple[WrittenNumber, str]] = {}
    problems: list[Problem] = []
    columns = [(c, kinds[c]) for c in table.columns if c in kinds]
    seen: dict[tuple[str, NumberKind], WrittenNumber | None] = {}
    for row in table.rows:
        for column, kind in columns:
            cell = row.cells.get(column)
            if cell is None:
                continue
            if isinstance(cell, float):
                values[row.number, column] = cell
                continue
            number = None
            if isinstance(cell, str):
                if (cell, kind) not in seen:
                    seen[cell, kind] = _readings(cell, kind=kind)
                number = seen[cell, kind]
            if number is None:
                problems.append(_not_a_number(table.file, row.number, column, cell, kind=kind))
            elif number.same_either_way:
                values[row.number, column] = next(iter(number.readings.values()))
            else:
                written[row.number, column] = (number, str(cell))
    more, chosen = _choose_marks(written, file=table.file)
    problems += more
    if chosen is not None:
        for place, (number, _) in written.items():
            if chosen in number.readings:
                values[place] = number.readings[chosen]
    return values, problems


def _choose_marks(
    written: Mapping[tuple[int, str], tuple[WrittenNumber, str]], *, file: str
) -> tuple[list[Problem], Marks | None]:
    only = {m: [p for p, (n, _) in written.items() if set(n.readings) == {m}] for m in Marks}
    if only[Marks.POINT] and only[Marks.COMMA]:
        fewer, more = sorted(only, key=lambda m: len(only[m]))
        row, column = only[more][0]
        example = f'"{written[only[more][0]][1]}" in row {row}, column {column}'
        problems = [
            Problem(
                file, r, c, f'"{written[r, c][1]}"',
                f"numbers written as in the rest of the file ({example})",
                f"Write the decimals after a {more.value} in every cell, and no thousands mark.",
                Rule.NUMBER_MARKS,
            )
            for r, c in only[fewer]
        ]  # fmt: skip
        return problems, more
    if only[Marks.POINT]:
        return [], Marks.POINT
    if only[Marks.COMMA]:
        return [], Marks.COMMA
    return [
        Problem(
            file, r, c, f'"{text}", which can be two numbers', "a number that can be read in one way",
            "Write it without a thousands mark.", Rule.NUMBER_MARKS,
        )
        for (r, c), (_, text) in written.items()
    ], None  # fmt: skip


def _not_a_number(file: str, row: int, column: str, cell: Cell, *, kind: NumberKind) -> Problem:
    expected = {
        NumberKind.PERCENT: "a percentage like 34.5",
        NumberKind.COUNT: "a whole number like 1024",
        NumberKind.QUANTITY: "a number like 812.5",
    }[kind]
    text = str(cell)
    if text.startswith(("<", "≤")):
        remedy = "Write 0 where nobody chose it, else the figure the house gave: a bound is no figure."
    elif text in {"-", "–", "—", "*", ".", "x", "X", "n/a", "N/A", "NA", "na", "?"}:
        remedy = "Leave the cell blank where nothing was asked or reported; write 0 where the figure is zero."
    elif kind is NumberKind.COUNT and text.endswith("%"):
        remedy = "Write the number itself, not a percentage."
    else:
        remedy = "Write the number alone; words belong in the note."
    return Problem(file, row, column, quoted(cell), expected, remedy, Rule.NUMBER)
