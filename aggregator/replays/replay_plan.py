"""From contest folders to the fits of a replay: each date with only what was known then."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from datetime import date
from pathlib import Path

import pandas as pd

from aggregator.errors import InputError, UsageError
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.inputs.outcome import Outcome, read_outcome
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity
from aggregator.refits.fit_task import FitTask, build_task
from aggregator.replays.replay_dates import ReplaySpan, replay_dates
from aggregator.replays.result_shares import has_seats, seats_of_outcome
from aggregator.settings import RunSettings

Progress = Callable[[str, float], None]


@dataclass(frozen=True)
class ContestReplay:
    """The replay of one contest before any fit.

    Attributes
    ----------
    name
        The contest folder's name.
    inputs
        The contest as it stands now.
    outcome
        How it came out; None where that is not known.
    dates
        The dates to be fitted.
    too_early
        Dates on which no usable poll was published yet.
    tasks
        One fit per date.
    polls_as_of
        The polls as they stood on each date.
    """

    name: str
    inputs: DeskInputs
    outcome: Outcome | None
    dates: tuple[date, ...]
    too_early: tuple[date, ...]
    tasks: tuple[FitTask, ...]
    polls_as_of: dict[date, pd.DataFrame]


def find_contests(folder: Path) -> tuple[Path, ...]:
    """List the contest folders: the folder itself, or those directly in it, by name.

    Raises
    ------
    InputError
        If there is none.
    """
    if (folder / CONTEST_FILE).is_file():
        return (folder,)
    found = tuple(sorted(p.parent for p in folder.glob(f"*/{CONTEST_FILE}"))) if folder.is_dir() else ()
    if not found:
        raise InputError(
            [
                Problem(
                    str(folder), None, None, f"no {CONTEST_FILE}, here or one folder down",
                    "a contest folder, or a folder of them", "Give the path of one.", Rule.FILE_THERE,
                )
            ]
        )  # fmt: skip
    return found


def plan_replays(
    folders: tuple[Path, ...],
    *,
    span: ReplaySpan,
    settings: RunSettings,
    today: date,
    progress: Progress = lambda _stage, _part: None,
) -> tuple[ContestReplay, ...]:
    """Read every contest, as it stands now and as it stood on each date.

    Parameters
    ----------
    folders
        Contest folders.
    span
        Which days are replayed.
    settings
        Length and seed of each fit.
    today
        The calendar's day.
    progress
        Called with a stage's name and its finished part, 0–1.

    Raises
    ------
    InputError
        If anything is wrong in any of the contests: with all findings of all of them.
    UsageError
        If the dates cannot work; see `replay_dates`. Also if no poll was published by the last of them.
    """
    plans: list[ContestReplay] = []
    problems: list[Problem] = []
    for place, folder in enumerate(folders):

        def tell(part: float, place: int = place) -> None:
            progress("reading the register as it stood", (place + part) / len(folders))

        try:
            plans.append(_plan(folder, span=span, settings=settings, today=today, tell=tell))
        except InputError as error:
            several = len(folders) > 1
            problems += [replace(p, file=f"{folder.name}/{p.file}") if several else p for p in error.problems]
    if problems:
        raise InputError(problems)
    return tuple(plans)


def _plan(
    folder: Path, *, span: ReplaySpan, settings: RunSettings, today: date, tell: Callable[[float], None]
) -> ContestReplay:
    inputs = read_contest_folder(folder, today=today)
    outcome = read_outcome(folder, contest=inputs.contest, last_result=inputs.last_result)
    if outcome is not None and has_seats(outcome.votes, contest=inputs.contest):
        # A tie that leaves a seat without a winner must be known before the fits, not after.
        seats_of_outcome(outcome.votes, contest=inputs.contest)
    voting = inputs.contest.last_polling_day
    under_way = inputs.run_date == today
    dates = replay_dates(span, polling_day=voting, today=today if under_way else None)
    name = folder.resolve().name
    then: dict[date, DeskInputs] = {}
    too_early: list[date] = []
    for place, day in enumerate(dates):
        tell(place / len(dates))
        known = _as_of(folder, day, today=today)
        if known is None:
            too_early.append(day)
        else:
            then[day] = known
    if not then:
        first = inputs.polls["published"].min().date()
        raise UsageError(
            f"{name}: the replay ends on {dates[-1]}, before the first poll that can be used "
            f"(published {first}). Name a later --to."
        )
    return ContestReplay(
        name=name,
        inputs=inputs,
        outcome=outcome,
        dates=tuple(then),
        too_early=tuple(too_early),
        tasks=tuple(build_task(known, name=name, settings=settings) for known in then.values()),
        polls_as_of={day: known.polls for day, known in then.items()},
    )


def _as_of(folder: Path, day: date, *, today: date) -> DeskInputs | None:
    """Read a contest as of a day; None where no usable poll was published yet."""
    try:
        return read_contest_folder(folder, as_of=day, today=today)
    except InputError as error:
        wrong = [p for p in error.problems if p.severity is Severity.ERROR]
        if all(p.rule is Rule.NO_USABLE_POLL for p in wrong):
            return None
        raise
