"""Overlapping fieldwork of one house, as in a tracking poll: nobody's answer counts twice."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from datetime import date, timedelta
from itertools import combinations

from aggregator.inputs.poll_breakdowns import rows_by_poll
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import Question
from aggregator.problems import Problem, Severity

type _Poll = list[PollRow]


def regions_by_poll(rows: Sequence[PollRow]) -> dict[str, frozenset[str]]:
    """Find the regions each poll asked in, by all rows of its vote question: also those that do not enter."""
    votes = [row for row in rows if row.question is Question.VOTE]
    return {p: frozenset(r for row in group for r in row.regions) for p, group in rows_by_poll(votes).items()}


def check_windows(
    rows: Sequence[PollRow], *, asked_in: Mapping[str, frozenset[str]], file: str
) -> tuple[dict[str, float], list[Problem]]:
    """Find the part of each poll's respondents that no earlier poll of its series already has.

    Polls are one series where house, regions, method, mode, population and sponsor are the same. Answers
    are taken as even over the window's days; of two polls the one that ended first keeps all its days.

    Parameters
    ----------
    rows
        The rows that enter the fit.
    asked_in
        Regions that each poll asked in, by poll: a wave whose row of one region does not enter still is of
        its series.

    Returns
    -------
    Part kept (0–1) by poll, polls without overlap left out, and a finding for each overlap.
    """
    series: dict[tuple[object, ...], list[_Poll]] = defaultdict(list)
    for group in rows_by_poll(rows).values():
        series[*_labels(group), asked_in[group[0].poll]].append(group)
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


def _labels(group: _Poll) -> tuple[object, ...]:
    """List what polls of one series have in common beside their regions."""
    first = group[0]
    # The rows of a poll agree on the other labels, not on who paid for each.
    sponsors = frozenset(row.sponsor for row in group)
    return first.house, first.method, first.mode, first.population, sponsors


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


def check_listed_twice(rows: Sequence[PollRow], *, file: str) -> list[Problem]:
    """Find polls that stand in the register a second time under another identifier.

    Same house, days, sample and figures in the same regions are one poll, whatever sponsor, mode, method
    or population the two listings give: nothing is left of the second one.

    Parameters
    ----------
    rows
        All rows of polls that enter, also a national row whose regional rows enter in its place.
    """
    places: dict[tuple[object, ...], list[PollRow]] = defaultdict(list)
    for row in sorted(rows, key=lambda r: r.row):
        places[row.house, row.start, row.end, row.sample, row.regions].append(row)
    problems, said = [], set[str]()
    for group in places.values():
        for earlier, later in combinations(group, 2):
            if later.poll != earlier.poll and later.poll not in said and _same_figures(earlier, later):
                said.add(later.poll)
                problems.append(
                    Problem(
                        file, later.row, None, f"house, days, sample and figures of row {earlier.row} "
                        f"({earlier.poll})", "interviews of its own",
                        "If it is that poll, delete this row or set use = no; if other people answered, "
                        "enter both as one poll, their samples added.", Rule.LISTED_TWICE,
                    )
                )  # fmt: skip
    return problems


def _same_figures(one: PollRow, other: PollRow) -> bool:
    """Tell whether two rows agree in every figure both give, and one gives no code the other lacks."""
    fewer, more = sorted((one.shares, other.shares), key=len)
    return len(fewer) > 1 and fewer.items() <= more.items()


def check_asked_there_too(
    rows: Sequence[PollRow], *, asked_in: Mapping[str, frozenset[str]], file: str
) -> Iterator[Problem]:
    """Warn of a poll in some regions on days on which another poll of its series asked there as well.

    A house's regional figures are often those of its national poll: then these people count twice, once
    under each identifier. Only the desk can know.

    Parameters
    ----------
    asked_in
        Regions that each poll asked in, by poll.
    """
    series: dict[tuple[object, ...], list[_Poll]] = defaultdict(list)
    for group in rows_by_poll(rows).values():
        series[_labels(group)].append(group)
    for groups in series.values():
        said = set[str]()
        # The poll in fewer regions is the one that may be a part of the other.
        by_size = sorted(groups, key=lambda g: (-len(asked_in[g[0].poll]), g[0].end, g[0].poll))
        for wide, narrow in combinations(by_size, 2):
            first, other = narrow[0], wide[0]
            here, there = asked_in[first.poll], asked_in[other.poll]
            start, end = max(first.start, other.start), min(first.end, other.end)
            if here == there or start > end or first.poll in said:
                continue
            both = sorted({r for row in narrow for r in row.regions if r in there})
            if both:
                said.add(first.poll)
                yield Problem(
                    file, first.row, "poll", f"{first.poll} in {'+'.join(both)}, where {other.poll} (row "
                    f"{other.row}) asked from {start} to {end} too", "respondents that are counted once",
                    "Both count in full; if these people are in both, give the rows one identifier, or set "
                    "use = no.", Rule.ASKED_THERE_TOO, Severity.WARNING,
                )  # fmt: skip
