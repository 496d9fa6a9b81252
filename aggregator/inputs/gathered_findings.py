"""One finding for a habit: what a house does in every row is said once."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import replace

from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity

# Ways of reporting that a house keeps to, and a register that reaches back beyond the last election.
_HABITS = {
    Rule.UNDECIDED_OUTSIDE, Rule.NO_REMAINDER, Rule.WINDOWS_OVERLAP, Rule.EARLIER_CONTEST,
    Rule.ASKED_THERE_TOO, Rule.MANY_UNDECIDED,
}  # fmt: skip

# What the calendar brings: the polls of all houses are said at once.
_OF_THE_CALENDAR = {Rule.HAD_VOTED}


def gather_habits(problems: Iterable[Problem], *, house_of_row: Mapping[int, str]) -> list[Problem]:
    """Join warnings of one rule and one house into the first of them, which then names the other rows.

    Those that follow from the calendar are joined whatever the house.

    Parameters
    ----------
    house_of_row
        House by row number of the register.
    """
    kept: list[Problem] = []
    groups: dict[tuple[str, str], list[Problem]] = defaultdict(list)
    for problem in problems:
        house = house_of_row.get(problem.row or 0) if problem.rule not in _OF_THE_CALENDAR else ""
        if (
            problem.rule in _HABITS | _OF_THE_CALENDAR
            and problem.severity is Severity.WARNING
            and house is not None
        ):
            groups[problem.rule, house].append(problem)
        else:
            kept.append(problem)
    for group in groups.values():
        first, *others = sorted(group, key=lambda p: p.row or 0)
        if others:
            rows = ", ".join(str(p.row) for p in others[:5])
            more = f", … ({len(others)} more in all)" if len(others) > 5 else ""
            first = replace(first, found=f"{first.found}; likewise in row(s) {rows}{more}")
        kept.append(first)
    return kept
