"""Findings on a screen, in a pipe and as JSON."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import asdict
from typing import Any

from rich.console import Console
from rich.text import Text

from aggregator.problems import Problem, Severity

_COLOURS = {Severity.ERROR: "bold red", Severity.WARNING: "bold yellow"}


def problem_records(problems: Iterable[Problem]) -> list[dict[str, Any]]:
    """Make plain records of findings, for JSON."""
    return [asdict(p) | {"severity": p.severity.value, "rule": str(p.rule)} for p in problems]


def count_of(problems: Iterable[Problem]) -> str:
    """``2 errors, 1 warning``."""
    severities = [p.severity for p in problems]
    errors = severities.count(Severity.ERROR)
    warnings = severities.count(Severity.WARNING)
    return f"{errors} error{'' if errors == 1 else 's'}, {warnings} warning{'' if warnings == 1 else 's'}"


def print_problems(problems: Iterable[Problem], *, console: Console) -> None:
    """Print findings by file, errors first.

    On a screen each part is wrapped between words; in a pipe each part stays on one line.
    """
    found = list(problems)
    for file in dict.fromkeys(p.file for p in found):
        console.print(Text(file, style="bold"), soft_wrap=True)
        of_file = [p for p in found if p.file == file]
        for problem in sorted(of_file, key=lambda p: p.severity is Severity.WARNING):
            _print_problem(problem, console)
        console.print()


def _print_problem(problem: Problem, console: Console) -> None:
    place = [f"row {problem.row}"] if problem.row is not None else []
    if problem.column is not None:
        place.append(f"{'key' if problem.file.endswith('.toml') else 'column'} {problem.column}")
    head = Text.assemble(
        (f"{problem.severity.value} {problem.rule}", _COLOURS[problem.severity]),
        "  " + (", ".join(place) or "the file"),
    )
    parts = (("found", problem.found), ("expected", problem.expected), ("to do", problem.remedy))
    console.print(Text("  ") + head, soft_wrap=True)
    for name, text in parts:
        if text:
            _print_part(name, text, console)


def _print_part(name: str, text: str, console: Console) -> None:
    line = Text.assemble("    ", (f"{name:<9}", "dim"), text)
    if not console.is_terminal:
        console.print(line, soft_wrap=True)
        return
    margin = Text(" " * 13)
    first, *others = Text(text).wrap(console, max(console.width - len(margin), 20))
    console.print(line[:13] + first)
    for piece in others:
        piece.rstrip()
        console.print(margin + piece)
