"""The last result: votes by party, one row per seat or per region, splits and mergers applied."""

from __future__ import annotations

import math
import statistics
from collections.abc import Iterator

import pandas as pd

from aggregator.inputs.cell_numbers import NumberKind, read_numbers
from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.contest import OTHERS, WHOLE_COUNTRY, Contest
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import RESULT_COLUMNS
from aggregator.inputs.sheet_table import SheetTable, as_text, check_columns, quoted
from aggregator.problems import Problem, Severity

# A seat with this many times the median's votes, or that small a part of them, is looked at twice.
UNUSUAL_SEAT = 20

type _Votes = dict[str, float]


def read_last_result(table: SheetTable, *, contest: Contest) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read the votes of the last election.

    Returns
    -------
    Columns ``seat``, ``name``, ``region``, then one per party code: votes, NaN where the cell is blank
    (the party did not stand there). None where something is wrong. And what was found.
    """
    donors = list(dict.fromkeys(d for p in contest.parties for d in p.inherits))
    codes = [c for c in table.columns if c in contest.party_codes or c in donors]
    problems = check_columns(
        table,
        names=contest.party_names,
        known=(*RESULT_COLUMNS, *contest.party_codes, *donors),
        needed=("region",) if len(contest.regions) > 1 else (),
        unknown_remedy="A column of votes bears a party's code, OTH, or a code that a party inherits from.",
    )
    problems += _check_code_columns(table, codes, donors, contest)
    votes, found = read_numbers(table, kinds=dict.fromkeys(codes, NumberKind.COUNT))
    problems += found
    problems += _check_votes(table, votes)
    if len(contest.regions) > 1 and "region" not in table.columns:
        return None, problems
    problems += _check_places(table, contest)
    rows = [
        {c: votes.get((row.number, c), math.nan) for c in (*contest.party_codes, *donors)}
        for row in table.rows
    ]
    problems += _check_totals(table, rows, broken={p.row for p in problems if p.rule is not Rule.PLACE_TWICE})
    problems += _check_kind(table, rows)
    problems += _check_standing(table, rows, contest)
    if any(p.severity is Severity.ERROR for p in problems):
        return None, problems
    return _result_frame(table, rows, contest), problems


def _check_code_columns(
    table: SheetTable, codes: list[str], donors: list[str], contest: Contest
) -> Iterator[Problem]:
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
    for donor in donors:
        if donor not in table.columns:
            heirs = ", ".join(p.code for p in contest.parties if donor in p.inherits)
            yield Problem(
                table.file, 1, donor, "no such column", f"the votes that {heirs} inherits",
                f"{did_you_mean(donor, table.columns)} Add the column, or correct inherits in contest.toml.",
                Rule.INHERITS,
            )  # fmt: skip
    for party in contest.parties:
        if party.code not in table.columns and not party.inherits:
            yield Problem(
                table.file, 1, party.code, "no such column", f"last votes of {party.name}",
                "The party is taken as new, with no last result to start from.",
                Rule.PARTY_WITHOUT_VOTES, Severity.WARNING,
            )  # fmt: skip
    if contest.others and OTHERS not in table.columns:
        yield Problem(
            table.file, 1, OTHERS, "no such column", "last votes of all others",
            "Others start without a last result; add the column if they had votes.",
            Rule.PARTY_WITHOUT_VOTES, Severity.WARNING,
        )  # fmt: skip


def _check_votes(table: SheetTable, votes: dict[tuple[int, str], float]) -> Iterator[Problem]:
    for (row, column), value in votes.items():
        if value < 0 or value != round(value):
            yield Problem(
                table.file, row, column, f"{value:g}", "a whole number of votes, 0 or more",
                "Enter votes, not percentages; leave blank where the party did not stand.", Rule.VOTES,
            )  # fmt: skip


def _check_places(table: SheetTable, contest: Contest) -> Iterator[Problem]:
    by_seat = "seat" in table.columns
    column = "seat" if by_seat else "region"
    names = {r.code: r.name for r in contest.regions}
    known = list(names)
    first: dict[str, int] = {}
    met = set()
    for row in table.rows:
        region = as_text(row.cells.get("region", ""))
        place = as_text(row.cells.get(column, ""))
        met.add(region)
        if by_seat and not place:
            yield Problem(
                table.file, row.number, "seat", "a blank cell", "a seat's name or number",
                "Name the seat, or drop the column where each row is a region.", Rule.CELL_NEEDED,
            )  # fmt: skip
        elif place or not by_seat:
            earlier = first.setdefault(place, row.number)
            if earlier != row.number:
                yield Problem(
                    table.file, row.number, column, f'"{place}", already in row {earlier}',
                    f"each {column} once", "Delete one, or correct its name.", Rule.PLACE_TWICE,
                )  # fmt: skip
        if known and not region:
            # With a single region a blank cell can mean only that one.
            if len(known) > 1:
                yield Problem(
                    table.file, row.number, "region", "a blank cell", "the code of a region",
                    "Enter the region of the seat.", Rule.CELL_NEEDED,
                )  # fmt: skip
        elif known and region not in known:
            yield Problem(
                table.file, row.number, "region", quoted(row.cells["region"]), "the code of one region",
                did_you_mean(region, known, names=names), Rule.ROW_REGION,
            )  # fmt: skip
        elif not known and region not in ("", WHOLE_COUNTRY):
            yield Problem(
                table.file, row.number, "region", quoted(row.cells["region"]),
                "a blank cell, since the contest names no region",
                "Empty the cell, or add the [[region]] to contest.toml.", Rule.ROW_REGION,
            )  # fmt: skip
    if len(known) > 1 and table.rows:
        for i, region in enumerate(known, start=1):
            if region not in met:
                yield Problem(
                    table.file, None, "region", f"no row for {region} (region[{i}] of contest.toml)",
                    "votes in every region", "Add its rows, or delete the region.",
                    Rule.REGION_WITHOUT_RESULT,
                )  # fmt: skip


def _check_totals(table: SheetTable, rows: list[_Votes], *, broken: set[int | None]) -> Iterator[Problem]:
    totals = [sum(v for v in votes.values() if not math.isnan(v)) for votes in rows]
    filled = [t for t in totals if t > 0]
    median = statistics.median(filled) if filled else 0.0
    for row, total in zip(table.rows, totals, strict=True):
        if row.number in broken:
            continue
        if total <= 0:
            yield Problem(
                table.file, row.number, None, "no vote for any party", "votes for one party or more",
                "Enter the votes.", Rule.NO_VOTES,
            )  # fmt: skip
        elif "seat" in table.columns and not median / UNUSUAL_SEAT <= total <= median * UNUSUAL_SEAT:
            yield Problem(
                table.file, row.number, None, f"{total:.0f} votes in all",
                f"a total nearer to the median seat's ({median:.0f})",
                "Look for a digit too many or too few.", Rule.SEAT_UNUSUAL, Severity.WARNING,
            )  # fmt: skip


# Whole percentages of a row sum to 100, give or take their rounding.
_PERCENT_TOTAL = range(98, 103)


def _check_kind(table: SheetTable, rows: list[_Votes]) -> Iterator[Problem]:
    """Look for tables that are not votes by place: percentages, a row of totals."""
    totals = [sum(v for v in votes.values() if not math.isnan(v)) for votes in rows]
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


def _sums_of_others(rows: list[_Votes], totals: list[float], group: list[int]) -> list[int]:
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


def _check_standing(table: SheetTable, rows: list[_Votes], contest: Contest) -> Iterator[Problem]:
    """Give one finding per party, not per seat: a party may well have stood more widely last time."""
    where = [_region_of(as_text(r.cells.get("region", "")), contest) for r in table.rows]
    for party in contest.parties:
        if party.regions is None:
            continue
        lost = [i for i, r in enumerate(where) if r not in party.regions and rows[i][party.code] > 0]
        if lost:
            total = sum(rows[i][party.code] for i in lost)
            places = ", ".join(dict.fromkeys(where[i] for i in lost))
            yield Problem(
                table.file, table.rows[lost[0]].number, party.code,
                f"{total:.0f} votes in {places}, where {party.code} does not stand",
                "votes only where the party stands",
                "They count for last time only; correct regions in contest.toml if the party stands there.",
                Rule.VOTES_NOT_STANDING, Severity.WARNING,
            )  # fmt: skip


def _region_of(cell: str, contest: Contest) -> str:
    return cell if cell and contest.regions else contest.region_codes[0]


def _result_frame(table: SheetTable, rows: list[_Votes], contest: Contest) -> pd.DataFrame:
    places = []
    for row, votes in zip(table.rows, rows, strict=True):
        region = _region_of(as_text(row.cells.get("region", "")), contest)
        seat = as_text(row.cells.get("seat", ""))
        name = as_text(row.cells.get("name", "")) or seat or region
        places.append({"seat": seat, "name": name, "region": region, **inherit(votes, region, contest)})
    frame = pd.DataFrame(places, columns=[*RESULT_COLUMNS, *contest.party_codes])
    return frame.astype(dict.fromkeys(contest.party_codes, float))


def inherit(votes: _Votes, region: str, contest: Contest) -> _Votes:
    """Give last votes by today's parties: each takes its parts of the columns it inherits from.

    All parts are taken of the votes as cast. What no heir that stands in the region takes stays with the
    donor where that is a party of today, and goes to others where it is not. Blank plus blank is blank.
    """
    parties = {p.code: p for p in contest.parties}
    today = {code: votes[code] for code in contest.party_codes}
    for donor in votes:
        given = votes[donor]
        if math.isnan(given):
            continue
        parts = {
            code: party.inherits[donor]
            for code, party in parties.items()
            if donor in party.inherits and contest.stands_in(code, region)
        }
        rest = max(0.0, 1 - sum(parts.values()))
        gains = {code: part * given for code, part in parts.items()}
        if donor in today:
            if parts:
                gains[donor] = -(1 - rest) * given
        elif rest > 1e-9:
            gains[OTHERS] = gains.get(OTHERS, 0.0) + rest * given
        for code, gain in gains.items():
            if code in today:
                today[code] = gain if math.isnan(today[code]) else today[code] + gain
    return today
