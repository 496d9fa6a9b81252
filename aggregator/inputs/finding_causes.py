"""Findings that only follow from another one are left out, so that the report names causes."""

from __future__ import annotations

import re
from collections.abc import Sequence

from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity

# Keys of a party, alliance or region on which no code and no figure in another file rests.
_HARMLESS_KEYS = re.compile(
    r"(party|alliance|region)\[\d+\]\.(name|colour|electorate|polling_day|counted|list_seats|joint_list)"
)

_OF_FIGURES = {
    Rule.TOO_FEW_CODES, Rule.SUM_OFF, Rule.SUM_SHORT, Rule.UNDECIDED, Rule.UNDECIDED_OUTSIDE,
    Rule.NO_REMAINDER,
}  # fmt: skip

# What candidates may do hangs on whether seats elect members, and how many.
_OF_COUNTING = {
    Rule.SEVERAL_MEMBERS, Rule.CANDIDATE_SEAT, Rule.CANDIDATE_TWICE, Rule.CANDIDATE_HOLDERS,
}  # fmt: skip

_OF_CODES = _OF_FIGURES | {
    Rule.COLUMN_UNKNOWN, Rule.ROW_REGION, Rule.COUNTED_TWICE, Rule.ALLIANCE_PERIOD, Rule.NOT_STANDING,
    Rule.INHERITS, Rule.REGION_WITHOUT_RESULT, Rule.VOTES_NOT_STANDING, Rule.PARTY_WITHOUT_VOTES,
    Rule.COUNT_REGIONS, Rule.COUNT_PLACES, Rule.PAST_CODE, Rule.EARLIER_PLACES, Rule.TRANSFER_PAIR,
    Rule.TRANSFER_MISSING, Rule.CANDIDATE_PARTY, Rule.PARTY_WITHOUT_CANDIDATE,
}  # fmt: skip


def without_consequences(problems: Sequence[Problem]) -> list[Problem]:
    """Leave out what cannot be known until something else is mended.

    Where the codes of the contest are in doubt, nothing is said about codes and shares in the other files;
    where the rule of counting is, nothing about what it asks of seats; where a column of a file is unknown,
    nothing about sums in that file; where a workbook has lost a value, nothing about blank cells in that row.
    """
    doubtful_codes = any(_is_about_codes(p) for p in problems)
    doubtful_counting = any(_is_about_counting(p) for p in problems)
    doubtful_columns = {p.file for p in problems if p.rule is Rule.COLUMN_UNKNOWN}
    lost_values = {(p.file, p.row) for p in problems if p.rule is Rule.WORKBOOK_SHAPE}
    kept = []
    for problem in problems:
        follows_from_codes = doubtful_codes and problem.file != CONTEST_FILE and problem.rule in _OF_CODES
        follows_from_columns = problem.file in doubtful_columns and problem.rule in _OF_FIGURES
        only_looks_blank = (problem.file, problem.row) in lost_values and problem.rule is Rule.CELL_NEEDED
        follows_from_counting = doubtful_counting and _hangs_on_counting(problem)
        if not (follows_from_codes or follows_from_counting or follows_from_columns or only_looks_blank):
            kept.append(problem)
    return kept


def _is_about_codes(problem: Problem) -> bool:
    key = problem.column or ""
    return (
        problem.file == CONTEST_FILE
        and problem.severity is Severity.ERROR
        and key.startswith(("party", "alliance", "region"))
        and not _HARMLESS_KEYS.fullmatch(key)
    )


def _is_about_counting(problem: Problem) -> bool:
    return (
        problem.file == CONTEST_FILE
        and problem.severity is Severity.ERROR
        and (problem.column or "").startswith("counting")
    )


def _hangs_on_counting(problem: Problem) -> bool:
    blank_seat = problem.rule is Rule.CELL_NEEDED and problem.column == "seat"
    return problem.rule in _OF_COUNTING or blank_seat
