"""Rows that are one poll: its regional breakdown agrees with itself and counts nobody twice."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence

from aggregator.inputs.contest import OTHERS, Contest
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import Question
from aggregator.problems import Problem, Severity

_SAME_IN_ALL_ROWS = (
    "house", "start", "end", "published", "mode", "population", "method", "status", "status_date", "replaces",
)  # fmt: skip

# Weighted bases are rounded row by row, so regional samples may exceed the whole by a little.
_SAMPLE_SLACK = 1.02

# Below this part of the whole, regional rows that cover the country leave too many respondents out.
_LEAST_COVERED = 0.8


def rows_by_poll(rows: Sequence[PollRow]) -> dict[str, list[PollRow]]:
    """Group the rows of each poll, in register order."""
    groups: dict[str, list[PollRow]] = defaultdict(list)
    for row in rows:
        groups[row.poll].append(row)
    return groups


def check_breakdowns(rows: Sequence[PollRow], *, file: str) -> list[Problem]:
    """Find everything wrong between the rows of one poll."""
    problems: list[Problem] = []
    for group in rows_by_poll(rows).values():
        if len(group) > 1:
            found = [*_check_agreement(group, file), *_check_overlap(group, file)]
            problems += found or _check_samples(group, file)
    return problems


def _check_agreement(group: list[PollRow], file: str) -> Iterator[Problem]:
    first = group[0]
    for row in group[1:]:
        for column in _SAME_IN_ALL_ROWS:
            here, there = getattr(row, column), getattr(first, column)
            if here != there:
                yield Problem(
                    file, row.row, column, _shown(here),
                    f"{_shown(there)} as in row {first.row}, which is the same poll ({row.poll})",
                    "Correct one of the two, or give the rows different identifiers in poll.",
                    Rule.BREAKDOWN_DISAGREES,
                )  # fmt: skip


def _shown(value: object) -> str:
    return "a blank cell" if value in ("", None) else f'"{value}"'


def _check_overlap(group: list[PollRow], file: str) -> Iterator[Problem]:
    votes = [row for row in group if row.question is Question.VOTE]
    for i, row in enumerate(votes):
        for earlier in votes[:i]:
            if earlier.national and row.national:
                found, expected = "the whole country a second time", "one row of a poll for the whole country"
            elif row.national or earlier.national or not set(row.regions) & set(earlier.regions):
                continue
            else:
                twice = "+".join(r for r in row.regions if r in earlier.regions)
                found, expected = f"{twice} a second time", "each region in one row of a poll"
            yield Problem(
                file, row.row, "region", f"{found} (row {earlier.row} has it too; poll {row.poll})",
                expected, "Correct the region, or give the polls different identifiers in poll.",
                Rule.BREAKDOWN_OVERLAP,
            )  # fmt: skip


def _check_samples(group: list[PollRow], file: str) -> Iterator[Problem]:
    votes = [row for row in group if row.wants_in and row.sample is not None]
    national = next((row for row in votes if row.national), None)
    parts = [row for row in votes if not row.national]
    together = sum(row.sample or 0 for row in parts)
    if national is None:
        if len(parts) > 1 and len({row.sample for row in parts}) == 1:
            yield Problem(
                file, parts[0].row, "sample", f"{parts[0].sample:g} in all {len(parts)} rows of one poll",
                "the number interviewed in the row's region",
                "If it is the size of the whole poll, divide it among the regions.",
                Rule.BREAKDOWN_SAMPLE, Severity.WARNING,
            )  # fmt: skip
        return
    whole = national.sample or 0
    if parts and together > whole * _SAMPLE_SLACK + 1:
        yield Problem(
            file, national.row, "sample",
            f"{whole:g}, while the {len(parts)} regional row(s) of the poll sum to {together:g}",
            "a whole no smaller than its parts",
            "A regional row's sample is the number interviewed in that region.", Rule.BREAKDOWN_SAMPLE,
        )  # fmt: skip
    elif _covers(parts, national) and together < whole * _LEAST_COVERED:
        yield Problem(
            file, national.row, "sample",
            f"{whole:g}, while the regional rows of the poll sum to only {together:g}",
            "regional rows that sum to the whole", "Check the regional samples.",
            Rule.BREAKDOWN_SAMPLE, Severity.WARNING,
        )  # fmt: skip


def _covers(parts: Sequence[PollRow], national: PollRow) -> bool:
    return {r for row in parts for r in row.regions} == set(national.regions)


def choose_rows(
    rows: Sequence[PollRow], *, contest: Contest
) -> tuple[list[PollRow], list[tuple[PollRow, str]]]:
    """Keep, of a poll with a national row and regional ones, one or the other, never both.

    The regional rows enter if they cover the country and name every code the national row names;
    else the national row enters.
    """
    groups = rows_by_poll(rows)
    kept, out = [], []
    for row in rows:
        group = groups[row.poll]
        national = next((r for r in group if r.national), None)
        parts = [r for r in group if not r.national]
        if national is None or not parts:
            kept.append(row)
            continue
        missing = _codes_missing(parts, national, contest)
        if not _covers(parts, national):
            reason = "" if row.national else "entered by its national row: the others leave regions out"
        elif missing:
            reason = "" if row.national else f"entered by its national row: only that names {missing}"
        else:
            reason = "entered by its regional rows" if row.national else ""
        if reason:
            out.append((row, reason))
        else:
            kept.append(row)
    return kept, out


def _codes_missing(parts: Sequence[PollRow], national: PollRow, contest: Contest) -> str:
    """Name the codes that the national row names and some regional row, where they stand, does not.

    An alliance's members, each with a figure, say more than the alliance; others are what is missing to 100.
    """
    missing = []
    for code in national.shares:
        for row in parts:
            members = [
                m for m in contest.members_of(code) if any(contest.stands_in(m, r) for r in row.regions)
            ]
            if code not in row.shares and not all(m in row.shares or m == OTHERS for m in members):
                missing.append(code)
    return ", ".join(dict.fromkeys(missing))
