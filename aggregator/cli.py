"""The commands: read options, call one function, print, exit with a code.

Heavy imports stand inside the commands, so that ``fieldfold --help`` is there at once.
"""

from __future__ import annotations

import errno
import sys
import traceback
from dataclasses import replace
from datetime import date, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer
from rich.console import Console
from rich.text import Text

from aggregator.command_output import (
    EXIT_CHECKS_FAILED,
    EXIT_INTERNAL,
    EXIT_INTERRUPTED,
    EXIT_MACHINE,
    Progress,
    error_record,
    examples,
    no_progress,
    print_json,
    say,
    with_progress_bar,
)
from aggregator.errors import FieldfoldError, InputError, UsageError
from aggregator.problem_display import count_of, print_problems, problem_records
from aggregator.replay_commands import CALIBRATE_EXAMPLES, REPLAY_EXAMPLES, calibrate, replay
from aggregator.settings import RunSettings

if TYPE_CHECKING:
    from aggregator.inputs.desk_inputs import DeskInputs
    from aggregator.weekly_run import RefreshOutcome

# What the disk or the system refuses; any other OSError is a mistake of ours and keeps its traceback.
_MACHINE_TROUBLE = {
    errno.ENOSPC, errno.EDQUOT, errno.EROFS, errno.EIO, errno.EACCES, errno.EPERM, errno.EMFILE,
    errno.ENFILE, errno.ENOMEM,
}  # fmt: skip


_FIRST_ROUND = """\b
A first round:
  fieldfold new lakes
  fieldfold check lakes
  fieldfold refresh lakes

\b
Exit codes: 0 done, 1 wrong input, 2 wrong usage, 3 done but checks failed,
5 machine trouble, 70 internal error, 130 interrupted."""

app = typer.Typer(
    name="fieldfold",
    epilog=_FIRST_ROUND,
    add_completion=False,
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)

_DIR = typer.Argument(metavar="DIR", help="The contest folder.", show_default=False)
_AS_OF = typer.Option(
    "--as-of",
    metavar="DATE",
    formats=["%Y-%m-%d"],
    help="Read the register as it stood on this day (year-month-day).",
)
_JSON = typer.Option("--json", help="Print one JSON object, and nothing else, on standard output.")


def main() -> None:
    """Run the command line; every way it can end has its exit code."""
    try:
        app(prog_name="fieldfold")
    except InputError as error:
        _print_report(error)
        sys.exit(error.exit_code)
    except FieldfoldError as error:
        say(f"fieldfold: {error}")
        sys.exit(error.exit_code)
    except MemoryError:
        say("fieldfold: the machine ran out of memory.")
        sys.exit(EXIT_MACHINE)
    except OSError as error:
        if error.errno not in _MACHINE_TROUBLE:
            _exit_internal(error)
        say(f"fieldfold: {error.strerror}" + (f": {error.filename}" if error.filename else ""))
        sys.exit(EXIT_MACHINE)
    except Exception as error:
        _exit_internal(error)


def _exit_internal(error: Exception) -> None:
    say(f"fieldfold: internal error ({type(error).__name__}: {error}); please report the lines below.")
    traceback.print_exception(error)
    sys.exit(EXIT_INTERNAL)


def _print_report(error: InputError) -> None:
    console = Console(stderr=True, highlight=False)
    print_problems(error.problems, console=console)
    console.print(Text(f"{count_of(error.problems)}. Nothing was written."), soft_wrap=True)


def _print_version(wanted: bool) -> None:
    if wanted:
        from importlib.metadata import version

        print(f"fieldfold {version('fieldfold')}")
        raise typer.Exit


@app.callback()
def _fieldfold(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_print_version, is_eager=True, help="Print the version."),
    ] = False,
) -> None:
    """Fold the fieldwork of many polling houses into one picture of an election."""


@app.command(epilog=examples("fieldfold new lakes"))
def new(
    folder: Annotated[Path, typer.Argument(metavar="DIR", help="The folder to make.", show_default=False)],
) -> None:
    """Make a commented new contest.

    It is invented and complete: check and refresh work on it at once. Then put your own parties, polls
    and votes in.
    """
    from aggregator.inputs.new_contest import new_contest

    for path in new_contest(folder, today=date.today()):
        print(path)


@app.command(epilog=examples("fieldfold check lakes --as-of 2031-04-01"))
def check(
    folder: Annotated[Path, _DIR],
    as_of: Annotated[datetime | None, _AS_OF] = None,
    as_json: Annotated[bool, _JSON] = False,
) -> None:
    """Read every file of a contest and report everything found.

    Errors stop a refresh; warnings travel into the release. Nothing is written.
    """
    from aggregator.inputs.contest_folder import read_contest_folder
    from aggregator.inputs.outcome import read_outcome

    try:
        inputs = read_contest_folder(folder, as_of=_day(as_of), today=date.today())
        outcome = read_outcome(folder, contest=inputs.contest, last_result=inputs.last_result)
    except InputError as error:
        if as_json:
            print_json(error_record(error, folder))
        else:
            _print_findings(error)
        raise typer.Exit(error.exit_code) from None
    if outcome is not None:
        inputs = replace(
            inputs,
            warnings=(*inputs.warnings, *outcome.warnings),
            fingerprints=(*inputs.fingerprints, outcome.fingerprint),
        )
    if as_json:
        print_json(_inputs_record(inputs))
    else:
        _print_inputs(inputs)


@app.command(
    epilog=examples(
        "fieldfold refresh lakes", "fieldfold refresh lakes --as-of 2031-04-01 --out april --seed 7"
    )
)
def refresh(
    folder: Annotated[Path, _DIR],
    as_of: Annotated[datetime | None, _AS_OF] = None,
    out: Annotated[
        Path | None,
        typer.Option(metavar="DIR", help="Write here instead of DIR/releases; needed with --as-of."),
    ] = None,
    seed: Annotated[int | None, typer.Option(metavar="N", min=0, help="Seed of all random numbers.")] = None,
    draws: Annotated[
        int | None, typer.Option(metavar="N", min=1, help="Posterior draws of each chain.")
    ] = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="Show no progress.")] = False,
    as_json: Annotated[bool, _JSON] = False,
) -> None:
    """Make this week's release: check, fit, count seats, write."""
    if as_of is not None and out is None:
        raise UsageError("--as-of needs --out: a look back is no release of the week.")
    settings = RunSettings()
    if seed is not None:
        settings = replace(settings, seed=seed)
    if draws is not None:
        settings = replace(settings, draws=draws)
    from aggregator.weekly_run import refresh as refresh_contest

    def run(progress: Progress) -> RefreshOutcome:
        return refresh_contest(
            folder,
            as_of=_day(as_of),
            out=out,
            settings=settings,
            today=date.today(),
            progress=progress,
        )

    try:
        outcome = run(no_progress) if quiet or as_json else with_progress_bar(run)
    except InputError as error:
        if not as_json:
            raise
        print_json(error_record(error, folder))
        raise typer.Exit(error.exit_code) from None
    except KeyboardInterrupt:
        say("fieldfold: interrupted; nothing was written.")
        raise typer.Exit(EXIT_INTERRUPTED) from None
    if as_json:
        print_json(_outcome_record(outcome))
    else:
        _print_outcome(outcome)
    if not outcome.passed:
        raise typer.Exit(EXIT_CHECKS_FAILED)


def _day(moment: datetime | None) -> date | None:
    return moment.date() if moment is not None else None


def _print_findings(error: InputError) -> None:
    console = Console(highlight=False)
    print_problems(error.problems, console=console)
    console.print(Text(f"{count_of(error.problems)}. A refresh would stop here."), soft_wrap=True)


def _print_inputs(inputs: DeskInputs) -> None:
    console = Console(highlight=False)
    print_problems(inputs.warnings, console=console)
    for line in _summary(inputs):
        console.print(Text(line), soft_wrap=True)
    console.print(Text(f"{count_of(inputs.warnings)}. Ready to refresh."), soft_wrap=True)


def _summary(inputs: DeskInputs) -> list[str]:
    polls, contest = inputs.polls, inputs.contest
    facts = {
        "polling day": contest.last_polling_day,
        "run stands on": inputs.run_date,
        "polls used": f"{polls['poll'].nunique()}, of {polls['house'].nunique()} house(s)",
        "last fieldwork": f"{polls['end'].max():%Y-%m-%d}",
        "rows left out": len(inputs.unused_polls),
        "seats": "not counted" if contest.counting.seats is None else contest.counting.seats,
    }
    if inputs.unpublished:
        facts["under embargo"] = ", ".join(inputs.unpublished)
    return [contest.title, *(f"  {name:<14}  {fact}" for name, fact in facts.items()), ""]


def _inputs_record(inputs: DeskInputs) -> dict[str, Any]:
    return {
        "folder": str(inputs.folder),
        "usable": True,
        "problems": problem_records(inputs.warnings),
        "run_date": inputs.run_date.isoformat(),
        "polls_used": int(inputs.polls["poll"].nunique()),
        "rows_used": len(inputs.polls),
        "rows_left_out": len(inputs.unused_polls),
        "unpublished": list(inputs.unpublished),
        "files": {f.file: f.sha256 for f in inputs.fingerprints},
    }


def _outcome_record(outcome: RefreshOutcome) -> dict[str, Any]:
    return {
        "release": str(outcome.release),
        "page": str(outcome.page),
        "passed": outcome.passed,
        "headlines": list(outcome.headlines),
        "notices": list(outcome.notices),
        "warnings": problem_records(outcome.warnings),
    }


def _print_outcome(outcome: RefreshOutcome) -> None:
    console = Console(highlight=False)
    for headline in outcome.headlines:
        console.print(Text(headline), soft_wrap=not console.is_terminal)
    if outcome.warnings:
        console.print(Text(f"\n{count_of(outcome.warnings)} (fieldfold check shows them)."), soft_wrap=True)
    console.print(Text(f"\n{outcome.page}"), soft_wrap=True)
    for notice in outcome.notices:
        say(notice)


study = typer.Typer(
    no_args_is_help=True, rich_markup_mode=None, help="Test the method on elections whose truth is known."
)
study.command(epilog=CALIBRATE_EXAMPLES)(calibrate)
app.command(epilog=REPLAY_EXAMPLES)(replay)
app.add_typer(study, name="study")
