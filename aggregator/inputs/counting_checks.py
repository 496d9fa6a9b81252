"""Whether votes can become seats by the contest's rules, and how many seats that is."""

from __future__ import annotations

import pandas as pd

from aggregator.inputs.chamber_parts import ChamberPart, find_parts
from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.counting_terms import Counting, CountingRule, Overhang
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.threshold_checks import check_thresholds
from aggregator.problems import Problem, Severity

# Far above any parliament, and below what a count in 16 bits can hold with all its seats made up for.
LARGEST_CHAMBER = 5000


def settle_counting(contest: Contest, *, last_result: pd.DataFrame | None) -> tuple[Contest, list[Problem]]:
    """Fill in rule, seats, majority and list seats where the contest leaves them to the last result.

    Without a ``rule`` the contest counts by plurality where the last result has seats, and counts nothing
    where it has none. Without a ``majority`` it is the smallest whole number above half of the seats, and
    stays open where overhang may enlarge the chamber: each count then has its own.
    """
    counting = contest.counting
    listed = 0 if last_result is None else int((last_result["seat"] != "").sum())
    if "rule" not in counting.model_fields_set and counting.seats is None and listed == 0:
        counting = counting.model_copy(update={"rule": CountingRule.NONE})
    contest = contest.model_copy(update={"counting": counting})
    if counting.rule is CountingRule.NONE:
        return contest, _seats_of_none(counting)
    if last_result is None or contest.last_result is None:
        return contest, [_no_result(counting.rule)]
    file = contest.last_result.file
    parts, problems = find_parts(contest, last_result=last_result, file=file)
    if problems:
        return contest, problems
    contest, parts, problems = _fill_in_rest(contest, parts)
    problems += check_thresholds(contest, last_result=last_result)
    known = [part.seats for part in parts if part.seats is not None]
    if len(known) < len(parts):
        return contest, problems
    problems += _check_sum(counting, parts)
    return _with_majority(contest, sum(known), problems)


def _seats_of_none(counting: Counting) -> list[Problem]:
    return [
        _problem(
            f"counting.{key}", str(value), "no such key where nothing is counted in seats",
            "Delete it, or name the rule.",
        )
        for key, value in (("seats", counting.seats), ("majority", counting.majority))
        if value is not None
    ]  # fmt: skip


def _no_result(rule: CountingRule) -> Problem:
    return _problem(
        "counting.rule", f'"{rule}"', "a last result, which says where votes become seats",
        "Add [last_result] with date and file, or count by another rule (none: votes only).",
    )  # fmt: skip


def _fill_in_rest(
    contest: Contest, parts: list[ChamberPart]
) -> tuple[Contest, list[ChamberPart], list[Problem]]:
    """Give the seats that are left to the one part of the chamber whose seats nothing states."""
    counting = contest.counting
    unknown = [part for part in parts if part.seats is None]
    if not unknown:
        return contest, parts, []
    known = sum(part.seats for part in parts if part.seats is not None)
    if counting.seats is None and len(parts) == 1:
        return contest, parts, [
            _problem("counting.seats", "no such key", "the number of seats to be filled", "Add the key.")
        ]  # fmt: skip
    if counting.seats is None or len(unknown) > 1:
        return contest, parts, [
            _problem(
                f"{part.table}.list_seats", "no such key", "the seats filled from these lists",
                "Add the key." if len(unknown) > 1 else "Add the key, or seats in [counting].",
            )
            for part in unknown
        ]  # fmt: skip
    rest = counting.seats - known
    if rest < 1:
        return contest, parts, [
            _problem(
                "counting.seats", str(counting.seats),
                f"more than the {known} of the other parts ({_named(parts)}), to leave some "
                f"{unknown[0].what}", "Correct the number, or one of the parts.",
            )
        ]  # fmt: skip
    filled = [part if part.seats is not None else ChamberPart(part.what, part.table, rest) for part in parts]
    return _with_list_seats(contest, table=unknown[0].table, seats=rest), filled, []


def _with_list_seats(contest: Contest, *, table: str, seats: int) -> Contest:
    """Write list seats into one table of terms, named by its key path."""
    counting = contest.counting
    if table == "counting":
        changed = counting.model_copy(update={"list_seats": seats})
    else:
        where = tuple(
            terms.model_copy(update={"list_seats": seats}) if table == f"counting.where[{i}]" else terms
            for i, terms in enumerate(counting.where, start=1)
        )
        changed = counting.model_copy(update={"where": where})
    return contest.model_copy(update={"counting": changed})


def _check_sum(counting: Counting, parts: list[ChamberPart]) -> list[Problem]:
    chamber = sum(part.seats or 0 for part in parts)
    if chamber > LARGEST_CHAMBER:
        return [
            _problem(
                "counting", f"{chamber} seats: {_named(parts)}", f"at most {LARGEST_CHAMBER}",
                "Look for a digit too many.",
            )
        ]  # fmt: skip
    if counting.seats in (None, chamber):
        return []
    if len(parts) > 1:
        expected, remedy = f"{chamber}: {_named(parts)}", "Correct the number, or one of its parts."
    elif counting.rule in (CountingRule.PLURALITY, CountingRule.TWO_ROUND):
        expected = f"{chamber}, the seats listed in the last result"
        remedy = "Correct the number, or list the missing seats."
    else:
        expected = f"{chamber}, the seats {parts[0].what}"
        remedy = "Correct the number, or the members of its parts."
    return [_problem("counting.seats", str(counting.seats), expected, remedy)]


def _named(parts: list[ChamberPart]) -> str:
    return ", ".join(f"{part.seats} {part.what}" for part in parts if part.seats is not None)


def _with_majority(contest: Contest, seats: int, problems: list[Problem]) -> tuple[Contest, list[Problem]]:
    majority = contest.counting.majority
    if majority is None and not may_grow(contest):
        majority = seats // 2 + 1
    if majority is not None and majority > seats:
        problems.append(
            _problem(
                "counting.majority", str(majority), f"at most the {seats} seats", "Correct one of the two."
            )
        )
    elif majority is not None and majority <= seats / 2:
        problems.append(
            _problem(
                "counting.majority", str(majority), f"above half of {seats} seats",
                "Two sides could reach it at once: check the number.", Severity.WARNING,
            )
        )  # fmt: skip
    settled = contest.counting.model_copy(update={"seats": seats, "majority": majority})
    return contest.model_copy(update={"counting": settled}), problems


def may_grow(contest: Contest) -> bool:
    """Tell whether overhang may give the chamber more seats than its regular number."""
    return any(
        terms.rule is CountingRule.MIXED_COMPENSATORY and terms.overhang is not Overhang.WITHIN
        for terms, _ in contest.counting_groups
    )


def _problem(
    key: str, found: str, expected: str, remedy: str, severity: Severity = Severity.ERROR
) -> Problem:
    return Problem(CONTEST_FILE, None, key, found, expected, remedy, Rule.COUNTING, severity)
