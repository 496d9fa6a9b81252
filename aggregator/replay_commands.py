"""The commands that make many fits: replays of past dates, and studies of invented elections."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer
from rich.console import Console
from rich.text import Text

from aggregator.command_output import (
    EXIT_CHECKS_FAILED,
    EXIT_INTERRUPTED,
    Progress,
    error_record,
    examples,
    no_progress,
    print_json,
    say,
    with_progress_bar,
)
from aggregator.errors import InputError
from aggregator.problem_display import count_of, print_problems, problem_records
from aggregator.settings import RunSettings

if TYPE_CHECKING:
    from aggregator.replays.replay import ReplayOutcome
    from aggregator.studies.calibration_report import CalibrationReport

REPLAY_EXAMPLES = examples(
    "fieldfold replay lakes",
    "fieldfold replay lakes --every 4w --from 2030-11-01 --to 2031-05-17",
    "fieldfold replay past_contests --from 52w --to 2d --past-errors record.csv",
)
CALIBRATE_EXAMPLES = examples(
    "fieldfold study calibrate --elections 20 --out calibration",
    "fieldfold study calibrate --violation late_swing --out calibration",
)
A_THOUSAND = 1000
OTHER_WORKERS = 16

_SCHEDULER = typer.Option(
    metavar="ADDRESS", help="Use the Dask cluster whose scheduler listens there, like tls://10.0.0.5:8786."
)
_WORKERS = typer.Option(metavar="N", min=1, help="Processes of this machine; default: one per core.")
_SEED = typer.Option(metavar="N", min=0, help="Seed of all random numbers.")
_DRAWS = typer.Option(metavar="N", min=1, help="Posterior draws of each chain.")
_QUIET = typer.Option("--quiet", help="Show no progress.")
_JSON = typer.Option("--json", help="Print one JSON object, and nothing else, on standard output.")


def replay(
    folder: Annotated[
        Path,
        typer.Argument(metavar="DIR", help="A contest folder, or a folder of them.", show_default=False),
    ],
    every: Annotated[str, typer.Option(metavar="STEP", help="Days or weeks between dates.")] = "7d",
    first: Annotated[
        str,
        typer.Option(
            "--from", metavar="WHEN", help="First date: a day, or days or weeks before polling day."
        ),
    ] = "26w",
    last: Annotated[
        str, typer.Option("--to", metavar="WHEN", help="Last date, likewise; dates count back from it.")
    ] = "1d",
    out: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Keep fits and report here; default: DIR/replays/FROM_TO."),
    ] = None,
    past_errors: Annotated[
        Path | None,
        typer.Option(metavar="FILE", help="Write the last errors of the polls as a past_errors.csv."),
    ] = None,
    scheduler: Annotated[str | None, _SCHEDULER] = None,
    workers: Annotated[int | None, _WORKERS] = None,
    seed: Annotated[int | None, _SEED] = None,
    draws: Annotated[int | None, _DRAWS] = None,
    quiet: Annotated[bool, _QUIET] = False,
    as_json: Annotated[bool, _JSON] = False,
) -> None:
    """Fit past dates with only what was known then, and score them.

    Each date sees the register as it stood at its end. Where the folder has a result_outcome.csv, a report
    holds the estimates, and those of simple rivals, against it. Fits that are there are not made again: the
    same command goes on where it was stopped.
    """
    from aggregator.replays.replay import replay as replay_contests
    from aggregator.replays.replay_dates import ReplaySpan, read_end, read_step

    span = ReplaySpan(
        every=read_step(every, option="--every"),
        first=read_end(first, option="--from"),
        last=read_end(last, option="--to"),
    )

    def run(progress: Progress) -> ReplayOutcome:
        return replay_contests(
            folder,
            span=span,
            out=out,
            settings=_settings(seed, draws),
            scheduler=scheduler,
            workers=workers,
            past_errors=past_errors,
            today=date.today(),
            progress=progress,
        )

    try:
        outcome = _followed(run, quiet=quiet or as_json)
    except InputError as error:
        if not as_json:
            raise
        print_json(error_record(error, folder))
        raise typer.Exit(error.exit_code) from None
    if as_json:
        print_json(_outcome_record(outcome))
    else:
        _print_outcome(outcome)
    if outcome.failed:
        raise typer.Exit(EXIT_CHECKS_FAILED)


def calibrate(
    out: Annotated[Path, typer.Option(metavar="DIR", help="Keep fits and report here.", show_default=False)],
    elections: Annotated[int, typer.Option(metavar="N", min=1, help="Number of elections.")] = 200,
    first_seed: Annotated[
        int, typer.Option(metavar="N", min=0, help="Seed of the first; the others follow one by one.")
    ] = 1,
    size: Annotated[
        str, typer.Option(metavar="SIZE", help="Of the elections: small, whole, or untidy.")
    ] = "small",
    violation: Annotated[
        str | None,
        typer.Option(
            metavar="NAME",
            help="What goes wrong in them that the model does not know: late_swing, herding, false_house, "
            "understated_noise, or partisan_refusals. They are then fitted without it, too.",
        ),
    ] = None,
    scheduler: Annotated[str | None, _SCHEDULER] = None,
    workers: Annotated[int | None, _WORKERS] = None,
    draws: Annotated[int | None, _DRAWS] = None,
    quiet: Annotated[bool, _QUIET] = False,
) -> None:
    """Fit invented elections and hold the intervals against the truth.

    Every election is drawn anew by a simulator that shares no code with the model. Fits that are there are
    not made again. The report lies in OUT/as_assumed, or in a folder named after the violation.
    """
    from aggregator.studies.calibrate import run_calibration
    from aggregator.studies.calibration_page import PAGE, cost_text, headlines
    from aggregator.studies.named_studies import size_called, violation_called

    wanted, wrong = size_called(size), violation_called(violation) if violation is not None else None

    def run(progress: Progress) -> CalibrationReport:
        return run_calibration(
            elections=elections,
            first_seed=first_seed,
            size=wanted,
            violation=wrong,
            out=out,
            scheduler=scheduler,
            workers=workers,
            settings=_settings(None, draws),
            progress=progress,
        )

    report = _followed(run, quiet=quiet)
    console = Console(highlight=False)
    for line in (*headlines(report), f"Cost: {cost_text(report)}.", str(out / report.plan.name / PAGE)):
        console.print(Text(line), soft_wrap=True)
    if report.verdict is not None and not report.verdict.passed:
        raise typer.Exit(EXIT_CHECKS_FAILED)


def _settings(seed: int | None, draws: int | None) -> RunSettings:
    settings = RunSettings()
    if seed is not None:
        settings = replace(settings, seed=seed)
    if draws is not None:
        settings = replace(settings, draws=draws)
    return settings


def _followed[Result](run: Callable[[Progress], Result], *, quiet: bool) -> Result:
    try:
        return run(no_progress) if quiet else with_progress_bar(run)
    except KeyboardInterrupt:
        say("fieldfold: interrupted; finished fits are kept, and the same command goes on from them.")
        raise typer.Exit(EXIT_INTERRUPTED) from None


def _print_outcome(outcome: ReplayOutcome) -> None:
    console = Console(highlight=False)
    for line in _summary(outcome):
        console.print(Text(line), soft_wrap=True)
    if outcome.warnings:
        print_problems(outcome.warnings, console=console)
        console.print(Text(f"{count_of(outcome.warnings)}."), soft_wrap=True)
    for notice in outcome.notices:
        say(notice)
    if outcome.failed:
        say(_failed_text(outcome))
    for path in (*outcome.pages, *((outcome.past_errors,) if outcome.past_errors else ())):
        console.print(Text(str(path)), soft_wrap=True)
    if not outcome.pages:
        console.print(Text(str(outcome.out)), soft_wrap=True)


def _summary(outcome: ReplayOutcome) -> list[str]:
    from aggregator.refits.pace import words_for

    costs, at_work = outcome.costs, outcome.workers
    lines = [
        f"{outcome.dates} fits, {outcome.made} of them made now.",
        f"A fit took {words_for(costs.next_seconds)}, {words_for(costs.first_seconds)} where its worker had "
        f"to compile; chains ran for {100 * costs.sampling_part:.0f} % of the time.",
    ]
    counts = sorted({at_work or 1, OTHER_WORKERS})
    forecasts = [
        f"{words_for(costs.seconds_for(A_THOUSAND, workers=n))} on {n} worker{'s' if n > 1 else ''}"
        for n in counts
    ]
    return [*lines, f"A thousand such fits would take about {', '.join(forecasts)}."]


def _failed_text(outcome: ReplayOutcome) -> str:
    named = [f"{day}" if len(outcome.contests) == 1 else f"{name} {day}" for name, day in outcome.failed]
    more = f", … ({len(named)} in total)" if len(named) > 5 else ""
    return f"Checks failed on {', '.join(named[:5])}{more}: run again with more --draws."


def _outcome_record(outcome: ReplayOutcome) -> dict[str, Any]:
    return {
        "out": str(outcome.out),
        "contests": list(outcome.contests),
        "fits": outcome.dates,
        "fits_made_now": outcome.made,
        "pages": [str(page) for page in outcome.pages],
        "past_errors": None if outcome.past_errors is None else str(outcome.past_errors),
        "failed": [{"contest": name, "date": day.isoformat()} for name, day in outcome.failed],
        "seconds_of_a_fit": outcome.costs.next_seconds,
        "seconds_of_a_thousand": outcome.costs.seconds_for(A_THOUSAND, workers=outcome.workers or 1),
        "workers": outcome.workers,
        "notices": list(outcome.notices),
        "warnings": problem_records(outcome.warnings),
    }
