"""Replays, start to finish: past dates refitted with what was known then, and held against the outcome."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from datetime import date
from itertools import islice
from pathlib import Path

from aggregator.errors import UsageError
from aggregator.problems import Problem
from aggregator.refits.fit_record import FitRecord
from aggregator.refits.pace import FitCosts, Pace, measure_costs, words_for
from aggregator.refits.record_files import FITS
from aggregator.refits.run_tasks import run_tasks
from aggregator.replays.past_errors_file import write_past_errors
from aggregator.replays.pooling import pool_replays
from aggregator.replays.replay_dates import ReplaySpan
from aggregator.replays.replay_plan import ContestReplay, find_contests, plan_replays
from aggregator.replays.replayed_fit import has_passed
from aggregator.replays.score_replay import ReplayScores, score_replay
from aggregator.replays.write_report import REPORT, write_pooled_report, write_replay_report
from aggregator.settings import RunSettings

REPLAYS = "replays"

Progress = Callable[[str, float], None]


@dataclass(frozen=True)
class ReplayOutcome:
    """What a replay left behind.

    Attributes
    ----------
    out
        The replay's folder; the fits are in its ``fits/``.
    contests
        Names of the contest folders.
    dates
        Number of dates fitted, over all contests.
    made
        Of these, the fits that were made now; the others were there.
    pages
        Pages of the reports, one per contest with an outcome, then that of all together where there are
        several.
    past_errors
        The record that was written, if any.
    failed
        Name of the contest and date of each fit whose checks failed.
    costs
        What the fits cost.
    workers
        Processes that made them; 0 where none was made.
    warnings
        What was doubtful in the outcomes.
    notices
        What must be said aloud: dates before the first poll, contests without outcome.
    """

    out: Path
    contests: tuple[str, ...]
    dates: int
    made: int
    pages: tuple[Path, ...]
    past_errors: Path | None
    failed: tuple[tuple[str, date], ...]
    costs: FitCosts
    workers: int
    warnings: tuple[Problem, ...]
    notices: tuple[str, ...]


def replay(
    folder: Path,
    *,
    span: ReplaySpan,
    out: Path | None = None,
    settings: RunSettings | None = None,
    scheduler: str | None = None,
    workers: int | None = None,
    past_errors: Path | None = None,
    today: date,
    progress: Progress = lambda _stage, _part: None,
) -> ReplayOutcome:
    """Refit a contest, or a folder of contests, on past dates, and score them where the outcome is known.

    Parameters
    ----------
    folder
        A contest folder, or a folder of contest folders.
    span
        Which days.
    out
        Where fits and reports go; a folder of its own in ``folder/replays`` by default. Fits that are there
        are not made again.
    settings
        Length and seed of each fit.
    scheduler, workers
        Where the fits are made; see `run_tasks`.
    past_errors
        Where to write the final errors of all contests as a record of earlier elections.
    today
        The calendar's day.
    progress
        Called with a stage's name and its finished part, 0–1.

    Raises
    ------
    InputError
        If a file of a contest is wrong; nothing is fitted then.
    UsageError
        If the call cannot work: said before anything is fitted.
    MachineError
        If the machine failed; finished fits are kept.
    """
    folders = find_contests(folder)
    plans = plan_replays(
        folders, span=span, settings=settings or RunSettings(), today=today, progress=progress
    )
    _check_titles(plans)
    if past_errors is not None:
        _check_record(past_errors, plans)
    place = out or folder / REPLAYS / _name(plans, span)
    _check_place(place)
    last: list[Pace] = []

    def tell(pace: Pace) -> None:
        last[:] = [pace]
        left = "" if pace.seconds_left is None else f", about {words_for(pace.seconds_left)} left"
        progress(f"fit {pace.finished} of {pace.total}{left}", pace.finished / pace.total)

    tasks = [task for plan in plans for task in plan.tasks]
    records = list(run_tasks(tasks, store=place, scheduler=scheduler, workers=workers, progress=tell))
    by_contest = list(_by_contest(plans, records))
    progress("scoring", 0.0)
    scored = [
        _score(plan, found, out=place if len(plans) == 1 else place / plan.name)
        for plan, found in by_contest
        if plan.outcome is not None
    ]
    pages = [page for _, page in scored]
    if len(scored) > 1:
        progress("pooling the contests", 0.0)
        pages.append(write_pooled_report(pool_replays([scores for scores, _ in scored]), out=place))
    return ReplayOutcome(
        out=place,
        contests=tuple(plan.name for plan in plans),
        dates=len(records),
        made=last[0].finished - last[0].found,
        pages=tuple(pages),
        past_errors=write_past_errors([scores for scores, _ in scored], path=past_errors)
        if past_errors is not None
        else None,
        failed=tuple(
            (plan.name, day)
            for plan, found in by_contest
            for day, record in zip(plan.dates, found, strict=True)
            if not has_passed(record)
        ),
        costs=measure_costs(record.facts for record in records),
        workers=last[0].workers,
        warnings=tuple(w for plan in plans if plan.outcome is not None for w in plan.outcome.warnings),
        notices=tuple(_notices(plans)),
    )


def _by_contest(
    plans: Sequence[ContestReplay], records: Sequence[FitRecord]
) -> Iterator[tuple[ContestReplay, list[FitRecord]]]:
    left = iter(records)
    for plan in plans:
        yield plan, list(islice(left, len(plan.tasks)))


def _score(plan: ContestReplay, records: Sequence[FitRecord], *, out: Path) -> tuple[ReplayScores, Path]:
    if plan.outcome is None:
        raise ValueError("a replay is scored against an outcome")
    scores = score_replay(
        records, inputs=plan.inputs, outcome=plan.outcome.votes, polls_as_of=plan.polls_as_of
    )
    return scores, write_replay_report(scores, records, inputs=plan.inputs, out=out)


def _name(plans: Sequence[ContestReplay], span: ReplaySpan) -> str:
    """Call the folder after the days of a single contest, else after what was asked for."""
    if len(plans) > 1:
        return span.name
    dates = (*plans[0].too_early, *plans[0].dates)
    return f"{dates[0]}_{dates[-1]}"


def _check_titles(plans: Sequence[ContestReplay]) -> None:
    titles = [plan.inputs.contest.title for plan in plans]
    twice = sorted({title for title in titles if titles.count(title) > 1})
    if twice:
        raise UsageError(f'Two contests are called "{twice[0]}": give each its own title in contest.toml.')


def _check_record(path: Path, plans: Sequence[ContestReplay]) -> None:
    if all(plan.outcome is None for plan in plans):
        raise UsageError("--past-errors needs an outcome: add result_outcome.csv to the contest.")
    if path.exists() or path.is_symlink():
        raise UsageError(f"{path} exists already; name a new file, and join the two by hand.")


def _check_place(place: Path) -> None:
    """Refuse a folder that holds something else than a replay."""
    if not place.exists():
        return
    if not place.is_dir():
        raise UsageError(f"{place} is a file; name a folder.")
    if any(place.iterdir()) and not any((place / name).is_dir() for name in (FITS, REPORT)):
        raise UsageError(f"{place} holds something that is not a replay; name another folder.")


def _notices(plans: Sequence[ContestReplay]) -> Iterator[str]:
    for plan in plans:
        if plan.too_early:
            yield (
                f"{plan.name}: no usable poll was published by {plan.too_early[-1]}; "
                f"{len(plan.too_early)} date(s) up to then were left out."
            )
        if plan.outcome is None:
            yield f"{plan.name}: no result_outcome.csv, so its fits are kept and not scored."
