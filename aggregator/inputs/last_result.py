"""The last result: votes by party, one row per seat or per region, splits and mergers applied."""

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
from aggregator.inputs.row_members import check_clusters, check_members
from aggregator.inputs.sheet_table import SheetTable, as_text, check_columns
from aggregator.problems import Problem, Severity


def read_last_result(table: SheetTable, *, contest: Contest) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read the votes of the last election.

    Returns
    -------
    Columns ``seat``, ``name``, ``region``, ``seats``, ``cluster``, then one per party code: votes, NaN where
    the cell is blank (the party did not stand there). None where something is wrong. And what was found.
    """
    donors = list_donors(contest)
    codes = [c for c in table.columns if c in contest.party_codes or c in donors]
    problems = check_columns(
        table,
        names=contest.party_names,
        known=(*RESULT_COLUMNS, *contest.party_codes, *donors),
        needed=("region",) if len(contest.regions) > 1 else (),
        unknown_remedy="A column of votes bears a party's code, OTH, or a code that a party inherits from.",
    )
    problems += check_code_columns(table, codes=codes, contest=contest)
    problems += _check_party_columns(table, donors, contest)
    rows, found = read_votes(table, codes=codes, absent=(*contest.party_codes, *donors))
    problems += found
    if len(contest.regions) > 1 and "region" not in table.columns:
        return None, problems
    problems += check_places(table, contest=contest)
    problems += _check_regions(table, contest)
    problems += check_totals(table, rows, broken={p.row for p in problems if p.rule is not Rule.PLACE_TWICE})
    problems += check_kind(table, rows)
    problems += check_members(table, contest=contest)
    problems += check_clusters(table, contest=contest)
    problems += _check_standing(table, rows, contest)
    if any(p.severity is Severity.ERROR for p in problems):
        return None, problems
    return hand_on(table, rows, contest=contest), problems


def _check_party_columns(table: SheetTable, donors: Sequence[str], contest: Contest) -> Iterator[Problem]:
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


def _check_regions(table: SheetTable, contest: Contest) -> Iterator[Problem]:
    met = {as_text(row.cells.get("region", "")) for row in table.rows}
    if len(contest.regions) < 2 or not table.rows:
        return
    for i, region in enumerate(contest.regions, start=1):
        if region.code not in met:
            yield Problem(
                table.file, None, "region", f"no row for {region.code} (region[{i}] of contest.toml)",
                "votes in every region", "Add its rows, or delete the region.", Rule.REGION_WITHOUT_RESULT,
            )  # fmt: skip


def _check_standing(table: SheetTable, rows: Sequence[Votes], contest: Contest) -> Iterator[Problem]:
    """Give one finding per party, not per seat: a party may well have stood more widely last time."""
    where = [region_of(row, contest=contest) for row in table.rows]
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


def list_donors(contest: Contest) -> list[str]:
    """List the codes whose last votes some party of today inherits, each once."""
    return list(dict.fromkeys(d for p in contest.parties for d in p.inherits))


def hand_on(table: SheetTable, rows: Sequence[Votes], *, contest: Contest) -> pd.DataFrame:
    """Build the table of votes by place after they were handed on to the parties of today."""
    today = [
        inherit(votes, region_of(row, contest=contest), contest)
        for row, votes in zip(table.rows, rows, strict=True)
    ]
    return build_result(table, today, contest=contest)


def inherit(votes: Votes, region: str, contest: Contest) -> Votes:
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
