"""Dates as desks write them: ISO always, day or month first only where the file itself settles which."""

from __future__ import annotations

import re
from collections.abc import Iterable
from datetime import date
from enum import StrEnum

from aggregator.inputs.contest import FIRST_DAY, LAST_DAY
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.sheet_table import SheetTable, quoted
from aggregator.problems import Problem, Severity

_YEAR_FIRST = re.compile(r"([0-9]{4})([-/.])([0-9]{1,2})\2([0-9]{1,2})(?:[T ]00:00(?::00(?:\.0+)?)?)?")
_YEAR_LAST = re.compile(r"([0-9]{1,2})([-/.])([0-9]{1,2})\2([0-9]{4})")


class Order(StrEnum):
    """Which of two numbers before the year is the day."""

    DAY_FIRST = "day first"
    MONTH_FIRST = "month first"


type _Place = tuple[int, str]


def _day(year: int, month: int, day: int) -> date | None:
    try:
        found = date(year, month, day)
    except ValueError:
        return None
    return found if FIRST_DAY <= found <= LAST_DAY else None


def read_dates(
    table: SheetTable, *, columns: Iterable[str]
) -> tuple[dict[tuple[int, str], date], list[Problem]]:
    """Read every filled cell of the date columns.

    A date such as 03/04/2031 is read only if another one of the file (23/04/2031) shows which number is
    the day; a warning then says so.

    Returns
    -------
    Days by (row number, column), cells that cannot be read left out, and what was found.
    """
    days: dict[_Place, date] = {}
    open_dates: dict[_Place, tuple[str, dict[Order, date]]] = {}
    true_dates: list[_Place] = []
    problems: list[Problem] = []
    wanted = [c for c in table.columns if c in set(columns)]
    for row in table.rows:
        for column in wanted:
            cell = row.cells.get(column)
            if cell is None:
                continue
            place = (row.number, column)
            if isinstance(cell, date) and FIRST_DAY <= cell <= LAST_DAY:
                days[place] = cell
                true_dates.append(place)
                continue
            found = _read_day(cell) if isinstance(cell, str) else None
            if isinstance(found, date):
                days[place] = found
            elif found:
                open_dates[place] = (str(cell), found)
            else:
                problems.append(_not_a_date(table.file, place, quoted(cell)))
    if open_dates and true_dates:
        return days, problems + _mixture(table.file, open_dates, true_dates)
    order, more = _choose_order(table.file, open_dates)
    problems += more
    if order is not None:
        days |= {p: found[order] for p, (_, found) in open_dates.items() if order in found}
    return days, problems


def _read_day(text: str) -> date | dict[Order, date] | None:
    """Read one day, or the day under each order, or None where the text is no date."""
    if match := _YEAR_FIRST.fullmatch(text):
        return _day(int(match[1]), int(match[3]), int(match[4]))
    match = _YEAR_LAST.fullmatch(text)
    if not match:
        return None
    first, second, year = int(match[1]), int(match[3]), int(match[4])
    found = {Order.DAY_FIRST: _day(year, second, first), Order.MONTH_FIRST: _day(year, first, second)}
    return {o: d for o, d in found.items() if d is not None}


def _choose_order(
    file: str, open_dates: dict[_Place, tuple[str, dict[Order, date]]]
) -> tuple[Order | None, list[Problem]]:
    if not open_dates:
        return None, []
    only = {o: [p for p, (_, found) in open_dates.items() if set(found) == {o}] for o in Order}
    if only[Order.DAY_FIRST] and only[Order.MONTH_FIRST]:
        fewer, more = sorted(only, key=lambda o: len(only[o]))
        row, column = only[more][0]
        example = f'"{open_dates[row, column][0]}" in row {row}, column {column}'
        return None, [
            Problem(
                file, r, c, f'"{open_dates[r, c][0]}"',
                f"dates in one order ({example} has the {more.value})",
                "Write all dates of the file as 2031-04-23.", Rule.DATE_ORDER,
            )
            for r, c in only[fewer]
        ]  # fmt: skip
    order = next((o for o in Order if only[o]), None)
    if order is None:
        # 04/04/2031 is the same day in either order, so it needs no evidence and gives none.
        unclear = [p for p, (_, found) in open_dates.items() if len(set(found.values())) > 1]
        if not unclear:
            return Order.DAY_FIRST, []
        return None, [
            Problem(
                file, r, c, f'"{open_dates[r, c][0]}", which can be two days',
                "a date that can be read in one way", "Write all dates of the file as 2031-04-23.",
                Rule.DATE_ORDER,
            )
            for r, c in unclear
        ]  # fmt: skip
    row, column = only[order][0]
    text, found = open_dates[row, column]
    return order, [
        Problem(
            file, row, column, f'"{text}"; all {len(open_dates)} dates of this form read {order.value}',
            f"dates like {found[order].isoformat()}",
            "Check a date whose day is below 13, or write all dates as year-month-day.",
            Rule.DATE_ORDER_FOUND, Severity.WARNING,
        )
    ]  # fmt: skip


def _mixture(
    file: str, open_dates: dict[_Place, tuple[str, dict[Order, date]]], true_dates: list[_Place]
) -> list[Problem]:
    row, column = true_dates[0]
    return [
        Problem(
            file, r, c, f'"{text}" as text, while row {row}, column {column} holds a true date',
            "true dates in all cells, or text in all",
            "A spreadsheet program may have swapped day and month in the true ones: "
            "check them, and write all as 2031-04-23.",
            Rule.DATE_MIXTURE,
        )
        for (r, c), (text, _) in open_dates.items()
    ]  # fmt: skip


def _not_a_date(file: str, place: _Place, found: str) -> Problem:
    remedy = "Write the day as year-month-day, the year in four digits, without a time."
    return Problem(file, place[0], place[1], found, "a date like 2031-04-23", remedy, Rule.DATE)
