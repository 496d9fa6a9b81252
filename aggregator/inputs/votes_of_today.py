"""Votes for the parties of today, a count or an outcome, held to the contest and the last result."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import pandas as pd

from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.contest import OTHERS, Contest
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import RESULT_COLUMNS
from aggregator.inputs.result_rows import (
    Votes,
    build_result,
    check_code_columns,
    check_kind,
    check_places,
    check_totals,
    read_votes,
    region_of,
)
from aggregator.inputs.row_members import check_members
from aggregator.inputs.sheet_table import SheetTable, as_text, check_columns
from aggregator.problems import Problem, Severity

# Turnout hardly ever halves or doubles between elections: a count that did is often a part of one.
LEAST_OF_LAST, MOST_OF_LAST = 0.5, 2.0


def read_votes_of_today(
    table: SheetTable, *, contest: Contest, last_result: pd.DataFrame | None, unfinished: str
) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read votes cast for the parties of today; nothing is inherited, and no other party is known.

    Parameters
    ----------
    last_result
        The last result, whose seats the regions that are there must have too; None where there is none, or
        where it could not be read.
    unfinished
        What to do while votes are still being counted, a sentence.

    Returns
    -------
    Columns as of the last result: ``seat``, ``name``, ``region``, ``seats``, ``cluster``, then votes by party
    code, NaN where the party did not stand. None where something is wrong. And what was found.
    """
    codes = [c for c in table.columns if c in contest.party_codes]
    problems = check_columns(
        table,
        names=contest.party_names,
        known=(*RESULT_COLUMNS, *contest.party_codes),
        needed=("region",) if len(contest.regions) > 1 else (),
        unknown_remedy="Votes of parties not in the contest belong in OTH; nothing is inherited here.",
    )
    problems += check_code_columns(table, codes=codes, contest=contest)
    rows, found = read_votes(table, codes=codes, absent=contest.party_codes)
    problems += found
    if len(contest.regions) > 1 and "region" not in table.columns:
        return None, problems
    places = list(check_places(table, contest=contest))
    problems += places
    problems += check_totals(table, rows, broken={p.row for p in problems if p.rule is not Rule.PLACE_TWICE})
    problems += check_kind(table, rows)
    problems += check_members(table, contest=contest)
    problems += _check_standing(table, rows, contest)
    if last_result is not None and not places:
        problems += _check_seats(table, last_result=last_result, contest=contest, unfinished=unfinished)
        problems += _check_members(table, last_result=last_result)
    if any(p.severity is Severity.ERROR for p in problems):
        return None, problems
    result = build_result(table, rows, contest=contest)
    if last_result is not None:
        result = _with_places_of(last_result, result)
        problems += _check_turnout(
            table, result, last_result=last_result, contest=contest, unfinished=unfinished
        )
    return result, problems


def _check_standing(table: SheetTable, rows: Sequence[Votes], contest: Contest) -> Iterator[Problem]:
    """Check that parties have votes where they stand, and only there; one finding per party and region."""
    where = [region_of(row, contest=contest) for row in table.rows]
    counted = [r for r in dict.fromkeys(where) if r in contest.region_codes]
    for code in contest.party_codes:
        standing = [r for r in counted if contest.stands_in(code, r)]
        if code not in table.columns:
            if standing:
                why = "0 where they had no vote" if code == OTHERS else "blank where it had no candidate"
                yield Problem(
                    table.file, 1, code, "no such column", f"votes of {contest.party_names[code]}",
                    f"Add the column, its cells {why}.", Rule.COLUMN_NEEDED,
                )  # fmt: skip
            continue
        for region in counted:
            cells = [(row.number, votes[code]) for row, votes, r in zip(table.rows, rows, where, strict=True)
                     if r == region]  # fmt: skip
            with_votes = [(number, v) for number, v in cells if v > 0]
            if region not in standing and with_votes:
                total = sum(v for _, v in with_votes)
                yield Problem(
                    table.file, with_votes[0][0], code, f"{total:.0f} votes in {region}, where {code} does "
                    "not stand", "votes only where the party stands",
                    "Correct the votes, or the party's regions in contest.toml.", Rule.NOT_STANDING,
                )  # fmt: skip
            elif region in standing and code != OTHERS and all(math.isnan(v) for _, v in cells):
                yield Problem(
                    table.file, cells[0][0], code, f"no figure in any row of {region}, where {code} stands",
                    "votes wherever the party stands",
                    "It is read as having had no candidate there; enter its votes if it had.",
                    Rule.PARTY_WITHOUT_VOTES, Severity.WARNING,
                )  # fmt: skip


def _check_seats(
    table: SheetTable, *, last_result: pd.DataFrame, contest: Contest, unfinished: str
) -> Iterator[Problem]:
    """Check that each region that is there has the seats it has in the last result, all of them."""
    by_seat = "seat" in table.columns
    if by_seat != bool((last_result["seat"] != "").any()):
        here, there = ("seat", "region") if by_seat else ("region", "seat")
        yield Problem(
            table.file, 1, "seat", f"rows by {here}, while the last result has rows by {there}",
            f"one row per {there}, as in the last result", "Give both files the same rows.",
            Rule.COUNT_PLACES,
        )  # fmt: skip
        return
    if not by_seat:
        return
    named = last_result[last_result["seat"] != ""]
    region_of_seat = dict(zip(named["seat"], named["region"], strict=True))
    rows: dict[str, dict[str, int]] = {}
    for row in table.rows:
        rows.setdefault(region_of(row, contest=contest), {})[as_text(row.cells.get("seat", ""))] = row.number
    for region, row_of_seat in rows.items():
        wanted = last_result.loc[last_result["region"] == region, "seat"].tolist()
        for seat, number in row_of_seat.items():
            if seat not in wanted:
                where = region_of_seat.get(seat)
                remedy = f"The last result has it in {where}." if where else did_you_mean(seat, wanted)
                yield Problem(
                    table.file, number, "seat", f'"{seat}"' if seat else "a blank cell",
                    f"a seat of {region} in the last result",
                    f"{remedy} Correct one of the two files.", Rule.COUNT_PLACES,
                )  # fmt: skip
        missing = [seat for seat in wanted if seat not in row_of_seat]
        if missing and missing != [""]:
            more = f", … ({len(missing)} in total)" if len(missing) > 5 else ""
            yield Problem(
                table.file, min(row_of_seat.values()), "seat",
                f"{region} without {', '.join(missing[:5])}{more}", f"all {len(wanted)} seats of the region",
                f"Add them. {unfinished}",
                Rule.COUNT_PLACES,
            )  # fmt: skip


def _check_members(table: SheetTable, *, last_result: pd.DataFrame) -> Iterator[Problem]:
    """Check that members, where the file has them, are those of the last result."""
    members = dict(zip(last_result["seat"], last_result["seats"], strict=True))
    for row in table.rows:
        seat, cell = (as_text(row.cells.get(column, "")) for column in ("seat", "seats"))
        wanted = members.get(seat) if seat else None
        if cell and wanted is not None and cell != str(wanted):
            yield Problem(
                table.file, row.number, "seats", cell, f"{wanted}, as in the last result",
                "The rows of the last result say how many members are elected now: correct either.",
                Rule.COUNT_PLACES,
            )  # fmt: skip


def _with_places_of(last_result: pd.DataFrame, result: pd.DataFrame) -> pd.DataFrame:
    """Take members and clusters of the seats from the last result, which says them for this election."""
    places = last_result.drop_duplicates(["seat", "region"]).set_index(["seat", "region"])
    of_row = places.reindex(pd.MultiIndex.from_frame(result[["seat", "region"]]))
    return result.assign(seats=of_row["seats"].to_numpy(dtype=int), cluster=of_row["cluster"].to_numpy())


def _check_turnout(
    table: SheetTable, result: pd.DataFrame, *, last_result: pd.DataFrame, contest: Contest, unfinished: str
) -> Iterator[Problem]:
    votes, last = (f.groupby("region")[list(contest.party_codes)].sum().sum(axis=1)
                   for f in (result, last_result))  # fmt: skip
    for region, now in votes.items():
        then = last.get(region, 0.0)
        if then > 0 and not LEAST_OF_LAST <= now / then <= MOST_OF_LAST:
            first = next(r.number for r in table.rows if region_of(r, contest=contest) == region)
            yield Problem(
                table.file, first, None, f"{now:.0f} votes in {region}",
                f"about as many as last time ({then:.0f})",
                unfinished,
                Rule.COUNT_UNUSUAL, Severity.WARNING,
            )  # fmt: skip
