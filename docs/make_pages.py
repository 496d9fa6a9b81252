"""Write what the pages repeat from the code: the commands page, and the map of the house in DEVELOPERS.md.

Run from the top of the project: ``python -m docs.make_pages``. A test fails where page and code differ.
"""

from __future__ import annotations

import ast
import re
import textwrap
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import typer
from typer.main import get_command

from aggregator.cli import app

TOP = Path(__file__).resolve().parent.parent
COMMANDS_PAGE = TOP / "docs" / "commands.md"
GUIDE = TOP / "DEVELOPERS.md"
MAPPED = ("aggregator", "models", "data_demo", "docs")
MAP_START, MAP_END = "<!-- map: written by docs/make_pages.py -->\n", "<!-- end of map -->\n"
HELP_WIDTH = 96
PAGE_WIDTH = 118

COMMANDS_OPENING = """\
# Commands

What `fieldfold --help` and `fieldfold COMMAND --help` say. Everything is also a Python call:
`aggregator.weekly_run.refresh`, `aggregator.inputs.contest_folder.read_contest_folder`,
`aggregator.inputs.new_contest.new_contest`, `aggregator.replays.replay.replay`,
`aggregator.studies.calibrate.run_calibration`.

| exit code | meaning |
| ---: | --- |
| 0 | done |
| 1 | wrong input: every finding is on screen, nothing was written |
| 2 | wrong usage: the command was called in a way that cannot work |
| 3 | done, but checks failed: a release is marked and lies under `releases/failed/`; a replay names dates |
| 5 | machine trouble: a full disk, a scheduler that does not answer, workers that keep dying |
| 70 | internal error: please report it |
| 130 | interrupted: nothing was written; of many fits, the finished ones are kept |
"""


def commands_page() -> str:
    """Build the commands page from the help texts."""
    group = get_command(app)
    top = group.make_context("fieldfold", [], resilient_parsing=True, terminal_width=HELP_WIDTH)
    return "\n".join([COMMANDS_OPENING, *_help_sections(group, top)])


def _help_sections(group: Any, context: typer.Context) -> Iterator[str]:
    """Give the help of a group, then of everything in it."""
    name = context.info_name
    inner = [(group.get_command(context, word), f"{name} {word}") for word in group.list_commands(context)]
    contexts = [
        (
            command,
            command.make_context(
                words, [], parent=context, resilient_parsing=True, terminal_width=HELP_WIDTH
            ),
        )
        for command, words in inner
    ]
    yield _help_section(context)
    for command, below in contexts:
        if hasattr(command, "list_commands"):
            yield from _help_sections(command, below)
        else:
            yield _help_section(below)


def _help_section(context: typer.Context) -> str:
    # The name of a command's context holds its parent's already: the usage line would say it twice.
    name = (context.info_name or "").strip()
    context.parent = None
    lines = [line.rstrip() for line in context.get_help().strip().splitlines()]
    return "\n".join([f"## {name}", "", "```text", *lines, "```", ""])


def guide_with_map(guide: str) -> str:
    """Put today's map between the marks of the contributors' guide."""
    return re.sub(
        f"{re.escape(MAP_START)}.*?{re.escape(MAP_END)}",
        lambda _: f"{MAP_START}\n{house_map()}\n{MAP_END}",
        guide,
        flags=re.DOTALL,
    )


def house_map() -> str:
    """List every package with its modules, each with the first sentence of its docstring."""
    folders = sorted({path.parent for top in MAPPED for path in (TOP / top).rglob("*.py")})
    return "\n".join(line for folder in folders for line in _folder_lines(folder))


def _folder_lines(folder: Path) -> Iterator[str]:
    yield f"**{folder.relative_to(TOP).as_posix()}/**"
    yield ""
    for path in sorted(folder.glob("*.py")):
        if path.name != "__init__.py":
            line = f"- `{path.name}`: {_first_sentence(path)}"
            yield from textwrap.wrap(line, PAGE_WIDTH, subsequent_indent="  ", break_on_hyphens=False)
    yield ""


def _first_sentence(path: Path) -> str:
    text = ast.get_docstring(ast.parse(path.read_text(encoding="utf-8"))) or ""
    return " ".join(text.split("\n\n")[0].split()).replace("``", "`")


if __name__ == "__main__":
    COMMANDS_PAGE.write_text(commands_page(), encoding="utf-8")
    GUIDE.write_text(guide_with_map(GUIDE.read_text(encoding="utf-8")), encoding="utf-8")
