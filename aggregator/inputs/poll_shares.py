"""A row's reported figures into shares of those who chose: undecided set aside, the rest to 100.

In points as the house reported them, S is the sum of the filled codes, U the undecided, and the base is
100 − U where the undecided are part of the 100, else 100. What is missing, base − S, is read thus:

=====================================  ====================================================================
every code of the row's regions given  rounding: the shares are rescaled to sum to 100, no remainder
OTH given, some codes not asked        rounding too; then OTH and the codes not asked are one: the remainder
OTH not given, more missing than       the remainder: what all codes not asked have together
rounding explains
OTH not given, nothing missing         no remainder to read: shares among the codes given (a warning)
=====================================  ====================================================================

Rounding explains up to half a step for each of the k figures: step · k / 2.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from aggregator.inputs.contest import OTHERS, Contest
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity

_STEPS = (1.0, 0.5, 0.1, 0.05, 0.01, 0.001)

# Fewer figures than this may all be whole by chance although the house reports decimals.
_FIGURES_THAT_SHOW_THE_STEP = 4

# Points that may be missing from a row that names every code before it is refused rather than doubted.
MOST_MISSING = 10.0

# Undecided above this leave too few answers to rescale.
MOST_UNDECIDED = 90.0

# Shares that sum to within this of 100 although undecided are given were rescaled by the house.
_ABOUT_A_HUNDRED = 2.0


@dataclass(frozen=True, slots=True)
class SharesOfRow:
    """Shares in percent of those who chose.

    Attributes
    ----------
    shares
        Percent by code; with ``remainder`` they sum to 100.
    remainder
        Percent of all codes not asked together; NaN where the row has none to read.
    decided
        Part of the respondents (0–1) left after the undecided were set aside.
    step
        Rounding step of the figures, in percent of those who chose.
    """

    shares: dict[str, float]
    remainder: float
    decided: float
    step: float


def rounding_step(values: Iterable[float]) -> float:
    """Find the coarsest step (1, 0.5, 0.1, …) of which all values are multiples."""
    found = list(values)
    return next(
        (s for s in _STEPS if all(abs(v / s - round(v / s)) < 1e-6 for v in found)),
        _STEPS[-1],
    )


def rounding_steps(rows: Sequence[PollRow]) -> dict[str, float]:
    """Find each poll's rounding step: from its own figures, or its house's where it has few."""
    by_house: dict[str, list[float]] = defaultdict(list)
    by_poll: dict[str, list[float]] = defaultdict(list)
    for row in rows:
        by_house[row.house].extend(row.shares.values())
        by_poll[row.poll].extend(row.shares.values())
    house_of = {row.poll: row.house for row in rows}
    house_step = {house: rounding_step(values) for house, values in by_house.items()}
    return {
        poll: rounding_step(values)
        if len(values) >= _FIGURES_THAT_SHOW_THE_STEP
        else house_step[house_of[poll]]
        for poll, values in by_poll.items()
    }


def codes_not_asked(row: PollRow, *, contest: Contest) -> set[str]:
    """List the parties, others included, that stand in the row's regions and have no figure there."""
    standing = {p for p in contest.party_codes if any(contest.stands_in(p, r) for r in row.regions)}
    return standing - {m for code in row.shares for m in contest.members_of(code)}


def read_shares(
    row: PollRow, *, contest: Contest, step: float, file: str
) -> tuple[SharesOfRow | None, list[Problem]]:
    """Set the undecided aside and find what the codes not asked have.

    Parameters
    ----------
    step
        Rounding step of the poll's figures, in points as reported.

    Returns
    -------
    The shares, None where the figures contradict themselves, and what was found.
    """
    shares = {
        code: value
        for code, value in row.shares.items()
        # A 0 for a party that stands in none of the row's regions is no answer; it reads as blank.
        if any(contest.stands_in(m, r) for m in contest.members_of(code) for r in row.regions)
    }
    total, undecided = math.fsum(shares.values()), row.undecided or 0.0
    rounding = step * len(shares) / 2 + 1e-9
    base, problems = 100.0, list[Problem]()
    if undecided > MOST_UNDECIDED:
        return None, [_too_many_undecided(row, file)]
    if undecided > 0:
        if total + undecided <= 100 + rounding + step / 2:
            base -= undecided
        elif abs(total - 100) <= max(rounding, _ABOUT_A_HUNDRED):
            problems.append(_undecided_outside(row, total, file))
        else:
            return None, [_undecided_contradict(row, total, file)]
    missing = base - total
    not_asked = codes_not_asked(row, contest=contest)
    remainder = math.nan
    if OTHERS in shares or not not_asked:
        if abs(missing) > rounding:
            problems.append(_sum_off(row, total, base, file))
        scale = 100 / total
        if OTHERS in shares and not_asked:
            remainder = shares.pop(OTHERS) * scale
    elif missing > rounding:
        scale = 100 / base
        remainder = missing * scale
    else:
        problems.append(_no_remainder(row, total, base, not_asked, rounding, file))
        scale = 100 / total
    if any(p.severity is Severity.ERROR for p in problems):
        return None, problems
    read = SharesOfRow(
        shares={c: v * scale for c, v in shares.items()},
        remainder=remainder,
        decided=1 - undecided / 100,
        step=step * scale,
    )
    return read, problems


def _too_many_undecided(row: PollRow, file: str) -> Problem:
    return Problem(
        file, row.row, "undecided", f"{row.undecided:g}", f"at most {MOST_UNDECIDED:g}",
        "Correct the figure, or set use = no and say why.", Rule.UNDECIDED,
    )  # fmt: skip


def _undecided_outside(row: PollRow, total: float, file: str) -> Problem:
    return Problem(
        file, row.row, "undecided", f"{row.undecided:g} beside shares that sum to {total:.6g}",
        "shares and undecided that sum to 100 together",
        "The shares are read as leaving the undecided out already; the respondents are still reduced.",
        Rule.UNDECIDED_OUTSIDE, Severity.WARNING,
    )  # fmt: skip


def _undecided_contradict(row: PollRow, total: float, file: str) -> Problem:
    return Problem(
        file, row.row, "undecided", f"{row.undecided:g} beside shares that sum to {total:.6g}",
        "shares that sum, with undecided, to at most 100, or without them to about 100",
        "Correct the figures; where the shares leave the undecided out, fill in OTH too.", Rule.UNDECIDED,
    )  # fmt: skip


def _sum_off(row: PollRow, total: float, base: float, file: str) -> Problem:
    found = f"shares that sum to {total:.6g}"
    expected = f"{base:.6g}, since every code is accounted for"
    if base - total > MOST_MISSING:
        remedy = "Enter what is missing: refusals belong in undecided, other parties in OTH."
        return Problem(file, row.row, None, found, expected, remedy, Rule.SUM_SHORT)
    remedy = "The shares are rescaled; check them against the published table."
    return Problem(file, row.row, None, found, expected, remedy, Rule.SUM_OFF, Severity.WARNING)


def _no_remainder(
    row: PollRow, total: float, base: float, not_asked: set[str], rounding: float, file: str
) -> Problem:
    found = f"shares that sum to {total:.6g}"
    if total - base > rounding:
        remedy = "The shares are rescaled; check them against the published table."
        return Problem(
            file, row.row, None, found, f"at most {base:.6g}", remedy, Rule.SUM_OFF, Severity.WARNING
        )
    return Problem(
        file, row.row, None, f"{found}, with no figure for {', '.join(sorted(not_asked))}",
        "something left for that",
        "The row is read as shares among the codes given; fill in 0 where a code was offered and not chosen.",
        Rule.NO_REMAINDER, Severity.WARNING,
    )  # fmt: skip
