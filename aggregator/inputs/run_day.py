"""The day a run stands on."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import date

from aggregator.errors import UsageError
from aggregator.inputs.contest import Contest
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem


@dataclass(frozen=True)
class RunDay:
    """The day, and whether the calendar of the contest is the desk's own.

    Attributes
    ----------
    day
        Estimates "today" are for this day.
    live
        Whether the contest is under way now: only then can a poll be under embargo, or in the future.
    """

    day: date
    live: bool


def choose_run_day(
    rows: Sequence[PollRow],
    *,
    entering: Sequence[PollRow],
    contest: Contest,
    as_of: date | None,
    today: date,
) -> RunDay:
    """Choose the day: as asked; else today; else, in a contest not under way, its last publication.

    Parameters
    ----------
    rows
        All rows of the register.
    entering
        Those that enter the fit.

    Raises
    ------
    UsageError
        If the day asked for lies after the last polling day.
    """
    last = contest.last_polling_day
    if as_of is not None:
        if as_of > last:
            raise UsageError(
                f"--as-of {as_of} lies after polling day ({last}): name that day or an earlier one."
            )
        return RunDay(as_of, live=False)
    started = any(row.start <= today for row in rows)
    if started and today <= last:
        return RunDay(today, live=True)
    published = max((row.published for row in entering), default=last)
    return RunDay(min(published, last), live=False)


def check_future(rows: Sequence[PollRow], *, run_day: RunDay, file: str) -> Iterator[Problem]:
    """Check that, in a contest that is under way, no fieldwork has ended after today."""
    if not run_day.live:
        return
    for row in rows:
        if row.end > run_day.day:
            yield Problem(
                file, row.row, "end", row.end.isoformat(), f"today ({run_day.day}) or a day before it",
                "Correct the date, or enter the poll when its fieldwork is over.", Rule.ENDS_LATER,
            )  # fmt: skip
