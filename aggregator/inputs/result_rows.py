"""Votes by place: what holds for every file of results, whichever election it is of."""

from __future__ import annotations

import math
import re
import statistics
from collections.abc import Iterable, Iterator, Sequence

import pandas as pd

from aggregator.inputs.cell_numbers import NumberKind, read_numbers
from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.contest import WHOLE_COUNTRY, Contest
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import RESULT_COLUMNS
from aggregator.inputs.sheet_table import SheetRow, SheetTable, as_text, quoted
from aggregator.problems import Problem, Severity

# A seat with this many times the median's votes, or that small a part of them, is looked at twice.
UNUSUAL_SEAT = 20

# Whole percentages of a row sum to 100, give or take their rounding.
_PERCENT_TOTAL = range(98, 103)

# A number of members, as a cell has it.
MEMBERS = re.compile(r"[1-9][0-9]{0,3}")

type Votes = dict[str, float]


def read_votes(
    table: SheetTable, *, codes: Sequence[str], absent: Iterable[str] = ()
) -> tuple[list[Votes], list[Problem]]:
    """Read the votes of each row by code: NaN where the cell is blank, and for codes without a column.

    Parameters
    ----------
    codes
        Codes of the columns of votes that the file has.
    absent
        Codes that the rows shall hold besides.
    """
    values, problems = read_numbers(table, kinds=dict.fromkeys(codes, NumberKind.COUNT))
    for (row, column), value in values.items():
        if value < 0 or value != round(value):
            problems.append(
                Problem(
                    table.file, row, column, f"{value:g}", "a whole number of votes, 0 or more",
                    "Enter votes, not percentages; leave blank where the party did not stand.", Rule.VOTES,
                )
            )  # fmt: skip
    wanted = dict.fromkeys([*codes, *absent])
    rows = [{c: values.get((row.number, c), math.nan) for c in wanted} for row in table.rows]
    return rows, problems


def total_votes(votes: Votes) -> float:
    """Sum a row's votes; blank cells have none."""
    return sum(v for v in votes.values() if not math.isnan(v))


def check_code_columns(table: SheetTable, *, codes: Sequence[str], contest: Contest) -> Iterator[Problem]:
    """Check that there are votes for two codes or more, in one row or more."""
    if len(codes) < 2:
        yield Problem(
            table.file, 1, None, f"{len(codes)} column(s) of votes", "two or more",
            f"Head the columns with party codes: {', '.join(contest.party_codes[:12])}.", Rule.TOO_FEW_CODES,
        )  # fmt: skip
    if not table.rows:
        yield Problem(
            table.file, None, None, "a header and no row", "one row per seat or region", "Enter the votes.",
            Rule.TABLE_EMPTY,
        )  # fmt: skip


def check_places(table: SheetTable, *, contest: Contest) -> Iterator[Problem]:
    """Check that each row is of a seat or region that no other row has, in a region that exists.

    A file of seats may have one row, its seat left blank, for a region whose rows elect nobody.
    """
    by_seat = "seat" in table.columns
    first: dict[tuple[str, str], int] = {}
    for row in table.rows:
        seat, region = (as_text(row.cells.get(column, "")) for column in ("seat", "region"))
        elects = contest.terms_in(region_of(row, contest=contest)).elects_by_row
        if by_seat and not seat and elects:
            yield Problem(
                table.file, row.number, "seat", "a blank cell", "a seat's name or number",
                "Name the seat, or drop the column where each row is a region.", Rule.CELL_NEEDED,
            )  # fmt: skip
        elif seat or not by_seat or region:
            column, place = ("seat", seat) if seat else ("region", region)
            earlier = first.setdefault((column, place), row.number)
            if earlier != row.number:
                yield Problem(
                    table.file, row.number, column, f'"{place}", already in row {earlier}',
                    f"each {column} once", "Delete one, or correct its name.", Rule.PLACE_TWICE,
                )  # fmt: skip
        yield from _check_region(row, table.file, contest)


def _check_region(row: SheetRow, file: str, contest: Contest) -> Iterator[Problem]:
    names = {r.code: r.name for r in contest.regions}
    known = list(names)
    region = as_text(row.cells.get("region", ""))
    if known and not region:
        # With a single region a blank cell can mean only that one.
        if len(known) > 1:
            yield Problem(
                file, row.number, "region", "a blank cell", "the code of a region",
                "Enter the region of the seat.", Rule.CELL_NEEDED,
            )  # fmt: skip
    elif known and region not in known:
        yield Problem(
            file, row.number, "region", quoted(row.cells["region"]), "the code of one region",
            did_you_mean(region, known, names=names), Rule.ROW_REGION,
        )  # fmt: skip
    elif not known and region not in ("", WHOLE_COUNTRY):
        yield Problem(
            file, row.number, "region", quoted(row.cells["region"]),
            "a blank cell, since the contest names no region",
            "Empty the cell, or add the [[region]] to contest.toml.", Rule.ROW_REGION,
        )  # fmt: skip


def check_totals(table: SheetTable, rows: Sequence[Votes], *, broken: set[int | None]) -> Iterator[Problem]:
    """Check that each row has votes, and about as many as the others.

    Parameters
    ----------
    broken
        Numbers of rows of which a cell could not be read.
    """
    totals = [total_votes(votes) for votes in rows]
    # Votes by member, so that districts of many members are no rarity; a whole region is no seat.
    sizes = [
        total / _members(row) if "seat" in row.cells else 0.0
        for row, total in zip(table.rows, totals, strict=True)
    ]
    seats = [size for size in sizes if size > 0]
    median = statistics.median(seats) if seats else 0.0
    for row, total, size in zip(table.rows, totals, sizes, strict=True):
        if row.number in broken:
            continue
        if total <= 0:
            yield Problem(
                table.file, row.number, None, "no vote for any party", "votes for one party or more",
                "Enter the votes.", Rule.NO_VOTES,
            )  # fmt: skip
        elif "seat" in row.cells and not median / UNUSUAL_SEAT <= size <= median * UNUSUAL_SEAT:
            several = f", {size:.0f} for each of its members" if size != total else ""
            yield Problem(
                table.file, row.number, None, f"{total:.0f} votes in all{several}",
                f"a total nearer to the median seat's ({median:.0f})",
                "Look for a digit too many or too few.", Rule.SEAT_UNUSUAL, Severity.WARNING,
            )  # fmt: skip


def _members(row: SheetRow) -> int:
    """Members that a row elects, as far as its cell can be read."""
    cell = as_text(row.cells.get("seats", ""))
    return int(cell) if MEMBERS.fullmatch(cell) else 1


def check_kind(table: SheetTable, rows: Sequence[Votes]) -> Iterator[Problem]:
    """Look for tables that are not votes by place: percentages, a row of totals."""
    totals = [total_votes(votes) for votes in rows]
    if len(rows) > 2 and all(total in _PERCENT_TOTAL for total in totals):
        yield Problem(
            table.file, None, None, "rows that all sum to about 100", "votes, not percentages",
            "Enter the number of votes.", Rule.VOTES,
        )  # fmt: skip
        return
    regions: dict[str, list[int]] = {}
    for place, row in enumerate(table.rows):
        regions.setdefault(as_text(row.cells.get("region", "")), []).append(place)
    groups = [*regions.values(), list(range(len(rows)))]
    found = {place: group for group in groups for place in _sums_of_others(rows, totals, group)}
    for place, group in sorted(found.items()):
        yield Problem(
            table.file, table.rows[place].number, None, f"the sum of {len(group) - 1} other rows",
            "a seat or a region", "Delete rows of totals.", Rule.TOTAL_ROW,
        )  # fmt: skip


def _sums_of_others(rows: Sequence[Votes], totals: list[float], group: list[int]) -> list[int]:
    """Find rows that hold, party by party, what the rest of their group holds together."""
    if len(group) < 3:
        return []
    whole = sum(totals[i] for i in group)
    return [
        place
        for place in group
        if 2 * totals[place] == whole
        and all(
            2 * value == sum(rows[i][code] for i in group if not math.isnan(rows[i][code]))
            for code, value in rows[place].items()
            if not math.isnan(value)
        )
    ]


def region_of(row: SheetRow, *, contest: Contest) -> str:
    """Give the region of a row; a blank cell is the only region there is."""
    cell = as_text(row.cells.get("region", ""))
    return cell if cell and contest.regions else contest.region_codes[0]


def members_of(row: SheetRow, *, elects: bool) -> int:
    """Give the members that a checked row elects.

    Parameters
    ----------
    elects
        Whether rows of its region elect members: then a seat or district of which the file says nothing
        elects one. Else 0, which says that the file leaves the number to the contest.
    """
    cell = as_text(row.cells.get("seats", ""))
    if cell:
        return int(cell)
    return 1 if elects and as_text(row.cells.get("seat", "")) else 0


def build_result(table: SheetTable, rows: Sequence[Votes], *, contest: Contest) -> pd.DataFrame:
    """Build the table of votes by place.

    Its columns are ``seat``, ``name``, ``region``, ``seats``, ``cluster``, then one per party code.

    Parameters
    ----------
    rows
        Votes of today's parties, by row of the table; NaN where a party did not stand.

    Raises
    ------
    ValueError
        If the file's ``seats`` were not checked (`aggregator.inputs.row_members.check_members`).
    """
    by_row = {region: contest.terms_in(region).elects_by_row for region in contest.region_codes}
    places = []
    for row, votes in zip(table.rows, rows, strict=True):
        region = region_of(row, contest=contest)
        seat = as_text(row.cells.get("seat", ""))
        name = as_text(row.cells.get("name", "")) or seat or region
        places.append(
            {
                "seat": seat,
                "name": name,
                "region": region,
                "seats": members_of(row, elects=by_row[region]),
                "cluster": as_text(row.cells.get("cluster", "")),
                **votes,
            }
        )
    frame = pd.DataFrame(places, columns=[*RESULT_COLUMNS, *contest.party_codes])
    return frame.astype({"seats": int} | dict.fromkeys(contest.party_codes, float))
