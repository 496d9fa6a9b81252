"""What commands share: how they speak, show progress, and leave."""

from __future__ import annotations

import json
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

from rich.console import Console

from aggregator.errors import InputError
from aggregator.problem_display import problem_records

# Called with what is being done and the finished part of it, 0–1.
type Progress = Callable[[str, float], None]

EXIT_CHECKS_FAILED = 3
EXIT_MACHINE = 5
EXIT_INTERNAL = 70
EXIT_INTERRUPTED = 130


def examples(*lines: str) -> str:
    r"""Lay out an epilog line by line: ``\b`` keeps the help from refilling it."""
    return "\b\n" + "\n".join(["Example:" if len(lines) == 1 else "Examples:", *(f"  {x}" for x in lines)])


def say(text: str) -> None:
    """Say something on standard error."""
    print(text, file=sys.stderr)


def print_json(record: dict[str, Any]) -> None:
    """Print one JSON object on standard output."""
    print(json.dumps(record, ensure_ascii=False, indent=2))


def error_record(error: InputError, folder: Path) -> dict[str, Any]:
    """Everything that is wrong with a folder, as plain values."""
    return {"folder": str(folder), "usable": False, "problems": problem_records(error.problems)}


def no_progress(stage: str, part: float) -> None:
    """Tell nobody."""


def with_progress_bar[Result](run: Callable[[Progress], Result]) -> Result:
    """Run something that tells its progress, and show that on standard error."""
    from rich.progress import BarColumn, SpinnerColumn, TextColumn, TimeElapsedColumn
    from rich.progress import Progress as ProgressBar

    columns = (SpinnerColumn(), TextColumn("{task.description}"), BarColumn(), TimeElapsedColumn())
    with ProgressBar(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task("", total=None)

        def progress(stage: str, part: float) -> None:
            # A stage that cannot say how far it is stays at 0, and the bar then only shows that it is alive.
            bar.update(task, description=stage, total=1.0 if part > 0 else None, completed=part)

        return run(progress)
