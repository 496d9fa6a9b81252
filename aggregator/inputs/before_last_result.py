"""The result before the last: how far seats stray from their region shows between the two."""

from __future__ import annotations

from collections.abc import Iterator

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.last_result import hand_on, list_donors
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import RESULT_COLUMNS
from aggregator.inputs.result_rows import (
    check_code_columns,
    check_kind,
    check_places,
    check_totals,
    read_votes,
)
from aggregator.inputs.row_members import check_members
from aggregator.inputs.sheet_table import SheetTable, as_text, check_columns
from aggregator.problems import Problem, Severity


def read_before_last_result(
    table: SheetTable, *, contest: Contest, last_result: pd.DataFrame | None
) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read the votes of the election before the last, handed on to the parties of today.

    Parameters
    ----------
    last_result
        The last result, whose seats are looked for by their labels; None where it could not be read.

    Returns
    -------
    Columns as of the last result; NaN where a party did not stand. None where something is wrong. And what
    was found.
    """
    donors = list_donors(contest)
    codes = [c for c in table.columns if c in contest.party_codes or c in donors]
    problems = check_columns(
        table,
        names=contest.party_names,
        known=(*RESULT_COLUMNS, *contest.party_codes, *donors),
        needed=("region",) if len(contest.regions) > 1 else (),
        unknown_remedy="Votes of parties that nobody inherits from belong in OTH.",
    )
    problems += check_code_columns(table, codes=codes, contest=contest)
    rows, found = read_votes(table, codes=codes, absent=(*contest.party_codes, *donors))
    problems += found
    if len(contest.regions) > 1 and "region" not in table.columns:
        return None, problems
    places = list(check_places(table, contest=contest))
    problems += places
    problems += check_totals(table, rows, broken={p.row for p in problems if p.rule is not Rule.PLACE_TWICE})
    problems += check_kind(table, rows)
    problems += check_members(table, contest=contest)
    if last_result is not None and not places and table.rows:
        problems += _check_seats(table, last_result)
    if any(p.severity is Severity.ERROR for p in problems):
        return None, problems
    return hand_on(table, rows, contest=contest), problems


def _check_seats(table: SheetTable, last_result: pd.DataFrame) -> Iterator[Problem]:
    """Compare labels of seats: none in common is an error, some missing a warning that names them."""
    now = last_result.loc[last_result["seat"] != "", "seat"].tolist()
    then = [label for row in table.rows if (label := as_text(row.cells.get("seat", "")))]
    if bool(now) != bool(then):
        here, there = ("seat", "region") if then else ("region", "seat")
        yield Problem(
            table.file, 1, "seat", f"rows by {here}, while the last result has rows by {there}",
            f"one row per {there}, as in the last result",
            "Give both files the same rows, or move this one out of the folder.", Rule.EARLIER_PLACES,
        )  # fmt: skip
        return
    if now and not set(now) & set(then):
        yield Problem(
            table.file, None, "seat",
            f"{_named(then)}, of which none is in the last result",
            f'seats labelled as in the last result, like "{now[0]}"',
            "Give a seat the same label in both files.", Rule.EARLIER_PLACES,
        )  # fmt: skip
        return
    absent = [seat for seat in now if seat not in set(then)]
    unknown = [seat for seat in then if seat not in set(now)]
    if absent:
        beside = f", while {_named(unknown)} of it are not seats of today" if unknown else ""
        yield Problem(
            table.file, None, "seat", f"no row for {_named(absent)}{beside}",
            "the seats of the last result",
            "They teach nothing about local moves; where only a label changed, write today's.",
            Rule.EARLIER_PLACES, Severity.WARNING,
        )  # fmt: skip


def _named(seats: list[str]) -> str:
    return ", ".join(seats[:5]) + (f", … ({len(seats)} in total)" if len(seats) > 5 else "")
