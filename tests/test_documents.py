"""The pages say what is there: commands, files, numbers, links and the map of the house."""

from __future__ import annotations

import importlib
import re
import tomllib
from dataclasses import fields, is_dataclass
from datetime import date
from pathlib import Path

import pytest
from typer.main import get_command

from aggregator.cli import app
from aggregator.estimate.sampler_checks import Limits
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.seats.baseline import BaselinePriors
from aggregator.seats.local_noise import LocalPriors
from docs.make_pages import commands_page, guide_with_map
from models.priors import Priors

TOP = Path(__file__).parent.parent
DOCS = TOP / "docs"
PAGES = [TOP / "README.md", TOP / "DEVELOPERS.md", *sorted(DOCS.glob("*.md"))]
PROJECT = tomllib.loads((TOP / "pyproject.toml").read_text(encoding="utf-8"))


def text_of(page: Path) -> str:
    return page.read_text(encoding="utf-8")


def code_blocks(page: Path, language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", text_of(page), flags=re.MULTILINE | re.DOTALL)


def setup_commands() -> list[str]:
    """One-line commands of the README's section on set-up."""
    section = text_of(TOP / "README.md").split("## Two commands")[1].split("\n## ")[0]
    return [block.strip() for block in re.findall(r"```sh\n(.*?)```", section, flags=re.DOTALL)]


def anchors(page: Path) -> set[str]:
    headings = re.findall(r"^#+ (.+)$", text_of(page), flags=re.MULTILINE)
    return {re.sub(r"[^\w\- ]", "", heading.lower()).replace(" ", "-") for heading in headings}


def table_rows(page: Path, *, heading: str) -> list[list[str]]:
    """Cells of the rows of the table below a heading, without its head."""
    section = text_of(page).split(f"\n## {heading}\n")[1].split("\n## ")[0]
    rows = [line.strip("|").split("|") for line in section.splitlines() if line.startswith("| `")]
    return [[cell.strip().strip("`") for cell in row] for row in rows]


def agrees(printed: str, value: float) -> bool:
    """Whether a printed number is the value, rounded to as many digits."""
    digits = len(printed.partition(".")[2])
    return abs(float(printed) - value) <= 0.5000001 * 10**-digits


def test_the_readme_sets_everything_up_in_two_lines():
    commands = setup_commands()
    assert len(commands) == 2
    assert all("\n" not in command for command in commands)
    demo, tests = commands
    assert demo.endswith(".venv/bin/fieldfold refresh data_demo/lake_provinces")
    assert tests.endswith(".venv/bin/pytest")


@pytest.mark.parametrize("command", setup_commands())
def test_the_two_lines_name_what_exists(command):
    assert (TOP / re.search(r"-c (\S+)", command).group(1)).is_file()
    for folder in re.findall(r"refresh (\S+)", command):
        assert (TOP / folder / "contest.toml").is_file()
    for extra in re.findall(r"\[(\w+)\]", command):
        assert extra in PROJECT["project"]["optional-dependencies"]
    assert "fieldfold" in PROJECT["project"]["scripts"]


def test_ci_runs_the_tests_with_the_line_of_the_readme():
    pattern = re.search(r"grep -m 1 -E '(.+?)' README.md", text_of(TOP / ".ci" / "run")).group(1)
    lines = [line for line in text_of(TOP / "README.md").splitlines() if re.search(pattern, line)]
    assert lines == [setup_commands()[1]]


def test_constraints_pin_every_dependency_and_name_no_address():
    lines = [x for x in text_of(TOP / ".ci" / "constraints.txt").splitlines() if not x.startswith("#")]
    assert all(re.fullmatch(r"[a-z0-9-]+==[0-9a-z.]+", line) for line in lines)
    pinned = {line.split("==")[0] for line in lines}
    wanted = PROJECT["project"]["dependencies"] + PROJECT["project"]["optional-dependencies"]["tests"]
    assert {re.match(r"[\w-]+", name).group().lower().replace("_", "-") for name in wanted} <= pinned


def test_every_command_and_option_is_in_the_commands_page():
    assert text_of(DOCS / "commands.md") == commands_page(), "run: python -m docs.make_pages"


def test_the_map_of_the_house_is_the_tree():
    guide = text_of(TOP / "DEVELOPERS.md")
    assert guide == guide_with_map(guide), "run: python -m docs.make_pages"


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_links_lead_somewhere(page):
    for target in re.findall(r"\]\(([^)\s]+)\)", text_of(page)):
        if re.match(r"https?:", target):
            continue
        path, _, anchor = target.partition("#")
        place = (page.parent / path).resolve() if path else page
        assert place.exists(), target
        assert not anchor or anchor in anchors(place), target


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_commands_shown_exist_with_their_options(page):
    shown = [line for block in code_blocks(page, "sh") for line in block.splitlines()]
    for line in shown:
        for words, rest in re.findall(r"fieldfold ((?:study )?\w[\w-]*)([^#&]*)", line):
            command = get_command(app)
            for word in words.split():
                command = command.commands[word]
            options = {option for parameter in command.params for option in parameter.opts}
            assert set(re.findall(r"--[\w-]+", rest)) <= options | {"--help"}, line


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_files_named_in_code_marks_exist(page):
    named = re.findall(r"`((?:aggregator|models|tests|data_demo|docs|\.ci)/[\w./-]+)`", text_of(page))
    assert [path for path in named if not (TOP / path).exists()] == []


def test_the_method_page_lists_every_prior_with_its_value():
    rows = table_rows(DOCS / "method.md", heading="Priors")
    values = {field.name: getattr(Priors(), field.name) for field in fields(Priors)}
    assert [row[0] for row in rows] == list(values)
    assert [row[0] for row in rows if not agrees(row[1], values[row[0]])] == []


def test_the_method_page_lists_the_numbers_outside_the_model():
    rows = table_rows(DOCS / "method.md", heading="Numbers outside the model")
    for name, where, printed, _ in rows:
        value = importlib.import_module(where)
        for part in name.split("."):
            value = getattr(value, part)
            value = value() if isinstance(value, type) and is_dataclass(value) else value
        assert agrees(printed, value), name
    listed = {row[0] for row in rows}
    for priors in (LocalPriors, BaselinePriors, Limits):
        assert {f"{priors.__name__}.{field.name}" for field in fields(priors)} <= listed


def test_the_glossary_is_in_order_and_gives_each_word_once():
    words = re.findall(r"^\*\*([^*]+)\*\*", text_of(DOCS / "glossary.md"), flags=re.MULTILINE)
    assert words == sorted(set(words), key=str.lower)


def test_the_smallest_register_of_start_here_can_be_read(tmp_path):
    (register,) = code_blocks(DOCS / "start_here.md", "csv")
    codes = register.splitlines()[0].split(",")[3:]
    parties = "".join(f'[[party]]\ncode = "{code}"\nname = "Party {code}"\n' for code in codes)
    contest = f'title = "Assembly"\npolling_day = 2031-05-18\n{parties}'
    (tmp_path / "contest.toml").write_text(contest, encoding="utf-8")
    (tmp_path / "polls.csv").write_text(register, encoding="utf-8")
    inputs = read_contest_folder(tmp_path, today=date(2031, 3, 1))
    assert len(inputs.polls) == 3
