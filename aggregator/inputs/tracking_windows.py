"""Overlapping fieldwork of one house, as in a tracking poll: nobody's answer counts twice."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from datetime import date, timedelta

from aggregator.inputs.poll_breakdowns import rows_by_poll
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity


def check_windows(rows: Sequence[PollRow], *, file: str) -> tuple[dict[str, float], list[Problem]]:
    """Find the part of each poll's respondents that no earlier poll of its series already has.

    Polls are one series where house, regions, method, mode, population and sponsor are the same. Answers
    are taken as even over the window's days; of two polls the one that ended first keeps all its days.

    Parameters
    ----------
    rows
        The rows that enter the fit.

    Returns
    -------
    Part kept (0–1) by poll, polls without overlap left out, and a finding for each overlap.
    """
    series: dict[tuple[object, ...], list[list[PollRow]]] = defaultdict(list)
    for group in rows_by_poll(rows).values():
        first = group[0]
        regions = frozenset(r for row in group for r in row.regions)
        label = (first.house, regions, first.method, first.mode, first.population, first.sponsor)
        series[label].append(group)
    kept: dict[str, float] = {}
    problems: list[Problem] = []
    for groups in series.values():
        taken: dict[date, PollRow] = {}
        # Of two that end together the shorter one goes first, so that the longer one keeps its own days.
        for group in sorted(groups, key=lambda g: (g[0].end, -g[0].start.toordinal(), g[0].poll)):
            first = group[0]
            days = _days(first)
            shared = [d for d in days if d in taken]
            if shared:
                kept[first.poll] = 1 - len(shared) / len(days)
                problems.append(_overlap(first, taken[shared[-1]], len(shared), len(days), file))
            taken |= {d: first for d in days if d not in taken}
    return kept, problems


def _days(row: PollRow) -> list[date]:
    return [row.start + timedelta(days=i) for i in range((row.end - row.start).days + 1)]


def _overlap(row: PollRow, earlier: PollRow, shared: int, days: int, file: str) -> Problem:
    found = (
        f"{shared} of {days} day(s) of {row.poll} ({row.start} to {row.end}) already in {earlier.poll} "
        f"(row {earlier.row}, {earlier.start} to {earlier.end}) of the same house"
    )
    if shared == days:
        return Problem(
            file, row.row, None, found, "fieldwork of its own",
            "If it is one poll, give both rows one identifier; if the interviews are others, tell them apart "
            "by method or sponsor; else set use = no.", Rule.WINDOW_SPENT,
        )  # fmt: skip
    return Problem(
        file, row.row, None, found, "interviews that are counted once",
        "The respondents of the shared days are counted in the earlier poll only.",
        Rule.WINDOWS_OVERLAP, Severity.WARNING,
    )  # fmt: skip
