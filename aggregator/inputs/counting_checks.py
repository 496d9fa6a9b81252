"""Whether votes can become seats by the contest's rule, and how many seats that is."""

from __future__ import annotations

import pandas as pd

from aggregator.inputs.contest import Contest, CountingRule
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity

# Rules by which this version counts; a run that could not count its seats must not begin.
COUNTED_RULES = (CountingRule.PLURALITY, CountingRule.NONE)


def settle_counting(contest: Contest, *, last_result: pd.DataFrame | None) -> tuple[Contest, list[Problem]]:
    """Fill in the rule, the seats and the majority where the contest leaves them to the last result.

    Without a ``rule`` the contest counts by plurality where the last result has seats, and counts nothing
    where it has none.
    """
    counting = contest.counting
    listed = 0 if last_result is None else int((last_result["seat"] != "").sum())
    rule = counting.rule
    if "rule" not in counting.model_fields_set and counting.seats is None and listed == 0:
        rule = CountingRule.NONE
    if rule not in COUNTED_RULES:
        found = _problem(
            "counting.rule", f'"{rule}"', f"{' or '.join(COUNTED_RULES)}, by which this version counts",
            "Use none to estimate votes without seats.",
        )  # fmt: skip
        return contest, [found]
    if rule is CountingRule.NONE:
        problems = [
            _problem(f"counting.{key}", str(value), "no such key where nothing is counted in seats",
                     "Delete it, or name the rule.")
            for key, value in (("seats", counting.seats), ("majority", counting.majority))
            if value is not None
        ]  # fmt: skip
        return contest.model_copy(update={"counting": counting.model_copy(update={"rule": rule})}), problems
    problems = []
    if rule is CountingRule.PLURALITY and listed == 0:
        problems.append(
            _problem(
                "counting.rule", '"plurality"', "a last result with one row per seat",
                "Add the column seat to the last result, or count by another rule (none: votes only).",
            )
        )  # fmt: skip
        return contest, problems
    if rule is CountingRule.PLURALITY and counting.seats not in (None, listed):
        problems.append(
            _problem(
                "counting.seats", str(counting.seats), f"{listed}, the seats listed in the last result",
                "Correct the number, or list the missing seats.",
            )
        )  # fmt: skip
    seats = counting.seats or listed or None
    if seats is None:
        problems.append(
            _problem("counting.seats", "no such key", "the number of seats to be filled", "Add the key.")
        )
        return contest, problems
    majority = counting.majority or seats // 2 + 1
    if majority > seats:
        problems.append(
            _problem(
                "counting.majority", str(majority), f"at most the {seats} seats", "Correct one of the two."
            )
        )
    elif majority <= seats / 2:
        problems.append(
            _problem(
                "counting.majority", str(majority), f"above half of {seats} seats",
                "Two sides could reach it at once: check the number.", Severity.WARNING,
            )
        )  # fmt: skip
    settled = counting.model_copy(update={"rule": rule, "seats": seats, "majority": majority})
    return contest.model_copy(update={"counting": settled}), problems


def _problem(
    key: str, found: str, expected: str, remedy: str, severity: Severity = Severity.ERROR
) -> Problem:
    return Problem(CONTEST_FILE, None, key, found, expected, remedy, Rule.COUNTING, severity)
