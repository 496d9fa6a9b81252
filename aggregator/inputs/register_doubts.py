"""What is not wrong in the register, but deserves a second look: warnings that travel into the release."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from datetime import timedelta
from itertools import combinations

import pandas as pd

from aggregator.inputs.contest import OTHERS, Contest
from aggregator.inputs.poll_breakdowns import rows_by_poll
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.poll_shares import SharesOfRow, codes_not_asked
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import Status
from aggregator.problems import Problem, Severity

SMALLEST_USUAL_SAMPLE, LARGEST_USUAL_SAMPLE = 100, 30_000

# Fieldwork longer than this mixes opinion of different times, and is often a wrong month.
LONGEST_USUAL_WINDOW = timedelta(days=35)

# Later than this after fieldwork, a publication is often a wrong year: the poll would seem under embargo.
LATEST_USUAL_PUBLICATION = timedelta(days=60)

# Two polls that agree in every figure are remarkable from this many figures on, within this time.
_FIGURES_TO_COMPARE, _TIME_TO_COMPARE = 4, timedelta(days=21)

# Above this most of those asked said nothing about a party: often people who will not vote are among them.
MOST_USUAL_UNDECIDED = 40.0

# A remainder is far above what others had from this many points and this many times on.
_POINTS_ABOVE, _TIMES_ABOVE = 5.0, 1.5


def check_doubts(
    rows: Sequence[PollRow],
    *,
    shares: Mapping[int, SharesOfRow],
    contest: Contest,
    last_result: pd.DataFrame | None,
    file: str,
) -> list[Problem]:
    """Find all doubts about the rows that enter."""
    return [
        *_check_asked(rows, contest, file),
        *_check_blanks(rows, file),
        *_check_samples(rows, file),
        *_check_windows(rows, file),
        *_check_publication(rows, file),
        *_check_provisional(rows, file),
        *_check_undecided(rows, file),
        *_check_same_figures(rows, file),
        *_check_remainders(rows, shares, contest, last_result, file),
    ]


def warning(
    file: str, row: int | None, column: str | None, found: str, expected: str, remedy: str, rule: Rule
) -> Problem:
    """Make a finding that does not stop the run."""
    return Problem(file, row, column, found, expected, remedy, rule, Severity.WARNING)


def listed(rows: Sequence[PollRow]) -> str:
    """Write ``row 4`` or ``rows 4, 7, 9, … (17 in total)``."""
    numbers = sorted(row.row for row in rows)
    if len(numbers) == 1:
        return f"row {numbers[0]}"
    text = ", ".join(str(n) for n in numbers[:5])
    return f"rows {text}" + (f", … ({len(numbers)} in total)" if len(numbers) > 5 else "")


def _check_asked(rows: Sequence[PollRow], contest: Contest, file: str) -> Iterator[Problem]:
    asked = {m for row in rows for code in row.shares for m in contest.members_of(code)}
    for party in contest.parties:
        if party.code not in asked:
            yield warning(
                file, 1, party.code, f"no figure for {party.name} in any poll that enters",
                "a figure in one poll or more", "Its support can only be guessed; add its column.",
                Rule.NEVER_ASKED,
            )  # fmt: skip


def _check_blanks(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    """Give one finding for the whole file: whoever leaves these cells blank mostly does so throughout."""
    unpublished = [row for row in rows if not row.published_given]
    if unpublished:
        yield warning(
            file, min(r.row for r in unpublished), "published", f"a blank cell in {listed(unpublished)}",
            "the day of publication", "The last day of fieldwork is taken for it.", Rule.PUBLISHED_BLANK,
        )  # fmt: skip
    startless = [row for row in rows if not row.start_given]
    if startless:
        yield warning(
            file, min(r.row for r in startless), "start", f"a blank cell in {listed(startless)}",
            "the first day of fieldwork", "Fieldwork is read as one day, the last one.", Rule.START_BLANK,
        )  # fmt: skip


def _check_samples(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    for group in rows_by_poll(rows).values():
        size = sum(row.sample or 0 for row in group)
        if not SMALLEST_USUAL_SAMPLE <= size <= LARGEST_USUAL_SAMPLE:
            yield warning(
                file, group[0].row, "sample", f"{size:g} respondents",
                f"{SMALLEST_USUAL_SAMPLE} to {LARGEST_USUAL_SAMPLE}",
                "Look for a digit too many or too few.", Rule.SAMPLE_UNUSUAL,
            )  # fmt: skip


def _check_windows(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    for row in rows:
        if row.end - row.start > LONGEST_USUAL_WINDOW:
            yield warning(
                file, row.row, "start", f"{row.start} for fieldwork that ended on {row.end}",
                f"at most {LONGEST_USUAL_WINDOW.days} days of fieldwork", "Check month and year.",
                Rule.LONG_WINDOW,
            )  # fmt: skip


def _check_publication(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    for group in rows_by_poll(rows).values():
        row = group[0]
        if row.published - row.end > LATEST_USUAL_PUBLICATION:
            yield warning(
                file, row.row, "published", f"{row.published} for fieldwork that ended on {row.end}",
                f"at most {LATEST_USUAL_PUBLICATION.days} days after fieldwork", "Check month and year.",
                Rule.PUBLISHED_LATE,
            )  # fmt: skip


def _check_provisional(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    for group in rows_by_poll(rows).values():
        if group[0].status is Status.PROVISIONAL:
            yield warning(
                file, group[0].row, "status", f"provisional figures of {group[0].poll}", "final figures",
                "Enter the final ones, when they are out, as a new row that replaces it.", Rule.PROVISIONAL,
            )  # fmt: skip


def _check_same_figures(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    by_figures: dict[tuple[object, ...], list[PollRow]] = defaultdict(list)
    for row in rows:
        if len(row.shares) >= _FIGURES_TO_COMPARE:
            by_figures[row.regions, tuple(sorted(row.shares.items()))].append(row)
    for group in by_figures.values():
        ordered = sorted(group, key=lambda r: (r.end, r.poll))
        for earlier, later in combinations(ordered, 2):
            near = later.end - earlier.end <= _TIME_TO_COMPARE and later.house == earlier.house
            if later.poll != earlier.poll and (near or later.sample == earlier.sample):
                yield warning(
                    file, later.row, None, f"the figures of row {earlier.row} ({earlier.poll})",
                    "figures of its own", "If a poll was entered twice, delete one.", Rule.SAME_FIGURES,
                )  # fmt: skip


def _check_undecided(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    for row in rows:
        if row.undecided is not None and row.undecided > MOST_USUAL_UNDECIDED:
            yield warning(
                file, row.row, "undecided", f"{row.undecided:g}", f"at most {MOST_USUAL_UNDECIDED:g}",
                "Check the figure; only those who chose count as respondents, and their shares are rescaled.",
                Rule.MANY_UNDECIDED,
            )  # fmt: skip


def _check_remainders(
    rows: Sequence[PollRow],
    shares: Mapping[int, SharesOfRow],
    contest: Contest,
    last_result: pd.DataFrame | None,
    file: str,
) -> Iterator[Problem]:
    stated = _largest_stated(rows, shares)
    known: dict[tuple[object, ...], float] = {}
    for row in rows:
        remainder = shares[row.row].remainder
        not_asked = frozenset(codes_not_asked(row, contest=contest))
        if math.isnan(remainder) or OTHERS in row.shares:
            continue
        place = (row.regions, not_asked)
        if place not in known:
            last = _last_share(row.regions, not_asked, contest, last_result)
            known[place] = _most_ever(row.regions, not_asked, last=last, stated=stated)
        ever = known[place]
        if remainder > ever + _POINTS_ABOVE and remainder > ever * _TIMES_ABOVE:
            yield warning(
                file, row.row, None, f"{remainder:.3g} % left for {', '.join(sorted(not_asked))}",
                f"no more than they ever had (about {ever:.2g} %)",
                "Refusals often hide in it: enter them in undecided.", Rule.LARGE_REMAINDER,
            )  # fmt: skip


type _Stated = dict[tuple[str, tuple[str, ...]], float]


def _largest_stated(rows: Sequence[PollRow], shares: Mapping[int, SharesOfRow]) -> _Stated:
    """Find the largest share of those who chose that polls state for each code in the same regions."""
    largest: _Stated = {}
    for row in rows:
        read = shares[row.row]
        figures = dict(read.shares)
        if OTHERS in row.shares:
            # A stated figure of others is the remainder where some code was not asked.
            figures.setdefault(OTHERS, read.remainder)
        for code, value in figures.items():
            largest[code, row.regions] = max(largest.get((code, row.regions), 0.0), value)
    return largest


def _most_ever(regions: tuple[str, ...], codes: frozenset[str], *, last: float, stated: _Stated) -> float:
    """Give the most that some codes had together, at the last election or in polls; NaN if no one knows."""
    others = max((v for (code, _), v in stated.items() if code == OTHERS), default=math.nan)
    figures = [others if code == OTHERS else stated.get((code, regions), math.nan) for code in codes]
    found = [value for value in (last, math.fsum(figures)) if not math.isnan(value)]
    return max(others, *found) if found and not math.isnan(others) else max(found, default=math.nan)


def _last_share(
    regions: tuple[str, ...], codes: frozenset[str], contest: Contest, last_result: pd.DataFrame | None
) -> float:
    """Give the percentage that some codes had together last time; NaN where one of them had no column."""
    if last_result is None:
        return math.nan
    if any(last_result[code].isna().all() for code in codes if code != OTHERS):
        return math.nan
    here = last_result.loc[last_result["region"].isin(regions), list(contest.party_codes)].sum()
    return 100 * float(here[sorted(codes)].sum() / here.sum())
