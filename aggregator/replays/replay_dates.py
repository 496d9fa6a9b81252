"""The dates of a replay: every so many days, up to a day before people vote."""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import date, timedelta

from aggregator.errors import UsageError

_STEP = re.compile(r"(\d{1,4})\s*([dw])")
_DAYS_OF = {"d": 1, "w": 7}


@dataclass(frozen=True)
class ReplaySpan:
    """Which days are replayed.

    Attributes
    ----------
    every
        Days from one date to the next.
    first, last
        A day of the calendar, or days before the last polling day.
    """

    every: timedelta = timedelta(days=7)
    first: date | timedelta = timedelta(weeks=26)
    last: date | timedelta = timedelta(days=1)

    @property
    def name(self) -> str:
        """Both ends, as a folder is called."""
        return "_".join(f"{e.days}d" if isinstance(e, timedelta) else str(e) for e in (self.first, self.last))


def read_step(text: str, *, option: str) -> timedelta:
    """Read a number of days or weeks, such as ``7d`` or ``2w``.

    Raises
    ------
    UsageError
        If it is none, or zero.
    """
    found = _STEP.fullmatch(text.strip().lower())
    days = int(found[1]) * _DAYS_OF[found[2]] if found else 0
    if days == 0:
        raise UsageError(f"{option} {text}: give a number of days or weeks above zero, such as 7d or 2w.")
    return timedelta(days=days)


def read_end(text: str, *, option: str) -> date | timedelta:
    """Read one end of a replay: a day (year-month-day), or days or weeks before polling day.

    Raises
    ------
    UsageError
        If it is neither.
    """
    try:
        return date.fromisoformat(text.strip())
    except ValueError:
        pass
    found = _STEP.fullmatch(text.strip().lower())
    if found is None:
        raise UsageError(
            f"{option} {text}: give a day such as 2031-03-01, or days or weeks before polling day, such as "
            "180d or 26w."
        )
    return timedelta(days=int(found[1]) * _DAYS_OF[found[2]])


def replay_dates(span: ReplaySpan, *, polling_day: date, today: date | None = None) -> tuple[date, ...]:
    """List the dates, counted back from the last one, so that the look nearest the vote is always there.

    Parameters
    ----------
    span
        Which days.
    polling_day
        The last polling day of the contest.
    today
        The calendar's day, where the contest is under way: nothing later can be replayed.

    Raises
    ------
    UsageError
        If the ends are out of order, or lie after polling day or in the future.
    """
    if span.every <= timedelta(0):
        raise UsageError(f"--every {span.every.days}d: give a number of days above zero, such as 7d.")
    first, last = (end if isinstance(end, date) else polling_day - end for end in (span.first, span.last))
    if last > polling_day:
        raise UsageError(
            f"--to {last} lies after polling day ({polling_day}): name that day or an earlier one."
        )
    if today is not None and last > today:
        if isinstance(span.last, date):
            raise UsageError(f"--to {last} lies in the future: name today ({today}) or an earlier day.")
        last = today
    if first > last:
        raise UsageError(f"--from {first} lies after --to {last}: name an earlier --from, or a later --to.")
    steps = (last - first) // span.every
    return tuple(last - k * span.every for k in range(steps, -1, -1))
