"""Calibration: many invented elections, each the whole way, held against their truth."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path

from aggregator.refits.fit_task import FitTask, build_task
from aggregator.refits.pace import Pace, words_for
from aggregator.refits.run_tasks import run_tasks
from aggregator.replays.replayed_fit import ReplayedFit
from aggregator.settings import RunSettings
from aggregator.studies.calibration_report import CalibrationPlan, CalibrationReport, build_report
from aggregator.studies.invented_elections import InventedElection, draw_invented_election
from aggregator.studies.judged_elections import JudgedElections, judge_elections
from aggregator.studies.write_calibration import check_place, write_calibration
from data_demo.made_up_election import ElectionSize
from data_demo.made_up_violation import Violation

# Called with what is being done and the finished part of it, 0–1.
type Progress = Callable[[str, float], None]


def run_calibration(
    *,
    elections: int,
    first_seed: int,
    size: ElectionSize,
    violation: Violation | None = None,
    out: Path,
    scheduler: str | None = None,
    workers: int | None = None,
    settings: RunSettings | None = None,
    progress: Progress = lambda _stage, _part: None,
) -> CalibrationReport:
    """Invent elections, fit each as a desk would, and compare with the truth.

    With a violation the same elections are also fitted without it, to tell what it breaks. Fits are kept in
    ``out/fits`` and never made twice, so that a study that was stopped goes on, and all violations of one
    size share the honest elections. The report goes to ``out/<name>/``, whole or not at all.

    Parameters
    ----------
    elections, first_seed
        How many, and the seed of the first; the others follow one by one.
    size
        How large and untidy they are.
    violation
        What goes wrong in them that the model knows nothing of.
    out
        Folder of the fits and the report.
    scheduler, workers
        Where the fits are made; see :func:`aggregator.refits.run_tasks.run_tasks`.
    settings
        Length of each fit; its seed is replaced by the election's.

    Raises
    ------
    UsageError
        If the report's folder already holds something else.
    MachineError
        If the machine failed; finished fits are kept.
    """
    plan = CalibrationPlan(elections, first_seed, size, violation, settings or RunSettings())
    place = out / plan.name
    check_place(place)

    def study(wrong: Violation | None) -> JudgedElections:
        return judge_elections(
            fitted_elections(
                replace(plan, violation=wrong),
                store=out,
                scheduler=scheduler,
                workers=workers,
                progress=progress,
            )
        )

    honest = study(None)
    report = (
        build_report(plan, honest)
        if violation is None
        else build_report(plan, study(violation), honest=honest)
    )
    progress("writing the report", 0.0)
    write_calibration(report, place)
    return report


def fitted_elections(
    plan: CalibrationPlan,
    *,
    store: Path,
    scheduler: str | None,
    workers: int | None,
    progress: Progress,
) -> Iterator[tuple[InventedElection, ReplayedFit]]:
    """Give each election of a plan with its fit, in the order of seeds."""
    invented: list[InventedElection] = []
    tasks: list[FitTask] = []
    for seed in plan.seeds:
        progress(f"inventing elections ({plan.name})", len(tasks) / plan.elections)
        election = draw_invented_election(seed, size=plan.size, violation=plan.violation)
        settings = replace(plan.settings, seed=seed)
        # Not named after the violation: where that leaves the register alone, one fit serves both.
        tasks.append(
            build_task(election.inputs, name=f"election_{seed}", settings=settings, test_figures=True)
        )
        invented.append(election)

    def tell(pace: Pace) -> None:
        left = "" if pace.seconds_left is None else f", {words_for(pace.seconds_left)} left"
        progress(f"fitting elections ({plan.name}{left})", pace.finished / pace.total)

    records = run_tasks(tasks, store=store, scheduler=scheduler, workers=workers, progress=tell)
    yield from zip(invented, records, strict=True)
