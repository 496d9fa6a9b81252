"""What the commands print, and the code they leave with."""

from __future__ import annotations

import json
import re
import subprocess
import sys
from dataclasses import dataclass, field
from datetime import date
from pathlib import Path
from types import ModuleType

import pytest

from aggregator import cli
from aggregator.problems import Problem
from aggregator.settings import RunSettings
from tests.inputs.desk_folder import spoilt, write_folder


def run(*arguments: object) -> int:
    """Run the command line in this process; the exit code."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(sys, "argv", ["fieldfold", *(str(a) for a in arguments)])
        with pytest.raises(SystemExit) as ended:
            cli.main()
    return ended.value.code if isinstance(ended.value.code, int) else 0


@dataclass(frozen=True)
class Outcome:
    release: Path
    page: Path
    passed: bool = True
    headlines: tuple[str, ...] = ("HU leads UP, 38 to 35 percent.",)
    warnings: tuple[Problem, ...] = ()
    notices: tuple[str, ...] = ()


@dataclass
class WeeklyRun:
    """Stands in for the weekly run, which needs minutes."""

    outcome: Outcome | BaseException
    asked: dict[str, object] = field(default_factory=dict)

    def refresh(self, folder, **options):
        self.asked = {"folder": folder, **options}
        options["progress"]("fitting", 0.5)
        if isinstance(self.outcome, BaseException):
            raise self.outcome
        return self.outcome


@pytest.fixture
def weekly_run(monkeypatch):
    def put(outcome: Outcome | BaseException) -> WeeklyRun:
        stub = WeeklyRun(outcome)
        module = ModuleType("aggregator.weekly_run")
        module.refresh = stub.refresh  # type: ignore[attr-defined]
        monkeypatch.setitem(sys.modules, "aggregator.weekly_run", module)
        return stub

    return put


def test_help_is_there_without_the_heavy_libraries():
    code = (
        "import sys; sys.argv = ['fieldfold', '--help']\n"
        "from aggregator.cli import main\n"
        "try: main()\n"
        "except SystemExit: pass\n"
        "print(sorted({'pandas', 'numpy', 'pymc', 'pydantic'} & set(sys.modules)))"
    )
    out = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout
    assert out.splitlines()[-1] == "[]"


@pytest.mark.parametrize("command", ["new", "check", "refresh"])
def test_every_command_shows_a_whole_example(command, capsys):
    assert run(command, "--help") == 0
    assert re.search(rf"^  +fieldfold {command} lakes", capsys.readouterr().out, re.MULTILINE)


def test_the_module_runs_as_the_command_does():
    done = subprocess.run([sys.executable, "-m", "aggregator", "--version"], capture_output=True, text=True)
    assert re.fullmatch(r"fieldfold \d+\.\d+\.\d+\n", done.stdout)


def test_new_then_check_is_a_round_without_findings(tmp_path, capsys):
    assert run("new", tmp_path / "lakes") == 0
    assert capsys.readouterr().out.splitlines()[0].endswith("contest.toml")
    assert run("check", tmp_path / "lakes") == 0
    assert capsys.readouterr().out.splitlines()[-1] == "0 errors, 0 warnings. Ready to refresh."


def test_new_refuses_a_folder_that_is_not_empty(tmp_path, capsys):
    folder = write_folder(tmp_path / "lakes")
    assert run("new", folder) == 2
    assert capsys.readouterr().err == (
        f"fieldfold: {folder} is not empty: name a folder that does not exist yet.\n"
    )


def test_check_shows_everything_found_and_leaves_with_1(tmp_path, capsys):
    polls = spoilt("polls.csv", (",1012,", ",many,"), (",1495,", ",40000,"))
    assert run("check", write_folder(tmp_path / "lakes", polls_csv=polls), "--as-of", "2031-04-30") == 1
    assert capsys.readouterr().out == (
        "polls.csv\n"
        "  error R25  row 2, column sample\n"
        '    found    "many"\n'
        "    expected a whole number like 1024\n"
        "    to do    Write the number alone; words belong in the note.\n"
        "\n"
        "1 error, 0 warnings. A refresh would stop here.\n"
    )


def test_check_as_json_owns_standard_output(tmp_path, capsys):
    polls = spoilt("polls.csv", (",1495,", ",40000,"))
    assert run("check", write_folder(tmp_path / "lakes", polls_csv=polls), "--json") == 0
    record = json.loads(capsys.readouterr().out)
    assert (record["usable"], record["rows_used"]) == (True, 5)
    assert [(p["row"], p["rule"], p["severity"]) for p in record["problems"]] == [(6, "R62", "warning")]


def test_check_as_json_reports_errors_too(tmp_path, capsys):
    polls = spoilt("polls.csv", (",1012,", ",many,"))
    assert run("check", write_folder(tmp_path / "lakes", polls_csv=polls), "--json") == 1
    record = json.loads(capsys.readouterr().out)
    assert record["usable"] is False
    assert record["problems"][0]["column"] == "sample"


def test_a_message_is_never_broken_inside_a_word_at_80_columns(tmp_path):
    from rich.console import Console

    from aggregator.problem_display import print_problems
    from tests.inputs.desk_folder import findings

    polls = spoilt("polls.csv", (",38.4,38.1", ",26.4,38.1"), (",50,42,,,8", ",50,38,4,,8"))
    found = findings(write_folder(tmp_path / "lakes", polls_csv=polls))
    console = Console(width=80, force_terminal=True, color_system=None, record=True)
    with console.capture() as capture:
        print_problems(found, console=console)
    text = capture.get()
    assert max(len(line.rstrip()) for line in text.splitlines()) <= 80
    assert {w for p in found for w in f"{p.found} {p.expected} {p.remedy}".split()} <= set(text.split())


def test_a_missing_folder_is_wrong_input(tmp_path, capsys):
    assert run("check", tmp_path / "nowhere") == 1
    assert "expected a contest folder" in capsys.readouterr().out


@pytest.mark.parametrize(
    "arguments",
    [["frobnicate"], ["check"], ["check", ".", "--as-of", "1 May"], ["refresh", ".", "--draws", "0"]],
)
def test_wrong_usage_leaves_with_2(arguments, capsys):
    assert run(*arguments) == 2
    assert capsys.readouterr().out == ""


def test_a_look_back_needs_a_place_to_go(capsys):
    assert run("refresh", "lakes", "--as-of", "2031-04-01") == 2
    assert "--as-of needs --out" in capsys.readouterr().err


def test_refresh_hands_its_options_on_and_prints_the_page(weekly_run, capsys):
    stub = weekly_run(Outcome(Path("out"), Path("out/public/index.html")))
    options = ["--as-of", "2031-04-01", "--out", "out", "--seed", "7", "--draws", "500", "--quiet"]
    assert run("refresh", "lakes", *options) == 0
    out = capsys.readouterr().out
    assert out == "HU leads UP, 38 to 35 percent.\n\nout/public/index.html\n"
    asked = {k: v for k, v in stub.asked.items() if k != "progress"}
    assert asked == {
        "folder": Path("lakes"), "as_of": date(2031, 4, 1), "out": Path("out"),
        "settings": RunSettings(seed=7, draws=500), "today": date.today(),
    }  # fmt: skip


def test_refresh_keeps_progress_off_standard_output(weekly_run, capsys):
    weekly_run(Outcome(Path("out"), Path("out/public/index.html")))
    assert run("refresh", "lakes") == 0
    assert capsys.readouterr().out == "HU leads UP, 38 to 35 percent.\n\nout/public/index.html\n"


def test_refresh_as_json_owns_standard_output(weekly_run, capsys):
    weekly_run(Outcome(Path("out"), Path("out/index.html")))
    assert run("refresh", "lakes", "--json") == 0
    record = json.loads(capsys.readouterr().out)
    assert (record["release"], record["page"], record["passed"]) == ("out", "out/index.html", True)


def test_failed_checks_leave_with_3(weekly_run, capsys):
    notice = "The checks of the fit failed."
    weekly_run(Outcome(Path("out"), Path("out/index.html"), passed=False, notices=(notice,)))
    assert run("refresh", "lakes", "--quiet") == 3
    assert capsys.readouterr().err == notice + "\n"


@pytest.mark.parametrize(
    ("trouble", "code", "first_line"),
    [
        (OSError(28, "No space left on device"), 5, "fieldfold: No space left on device"),
        (MemoryError(), 5, "fieldfold: the machine ran out of memory."),
        (
            ValueError("odd"),
            70,
            "fieldfold: internal error (ValueError: odd); please report the lines below.",
        ),
    ],
)
def test_trouble_has_its_code_and_one_line_on_top(trouble, code, first_line, weekly_run, capsys):
    weekly_run(trouble)
    assert run("refresh", "lakes", "--quiet") == code
    err = capsys.readouterr().err
    assert err.splitlines()[0] == first_line
    assert ("Traceback" in err) == (code == 70)


def test_interrupted_leaves_with_130(weekly_run, capsys):
    weekly_run(KeyboardInterrupt())
    assert run("refresh", "lakes", "--quiet") == 130
    assert capsys.readouterr().err == "fieldfold: interrupted; nothing was written.\n"


def test_wrong_input_stops_a_refresh_with_the_whole_report(tmp_path, weekly_run, capsys):
    from aggregator.errors import InputError

    problem = Problem("polls.csv", 2, "sample", '"many"', "a number", "Write it.", "R25")
    weekly_run(InputError([problem]))
    assert run("refresh", "lakes", "--quiet") == 1
    assert capsys.readouterr().err.endswith("1 error, 0 warnings. Nothing was written.\n")
    assert run("refresh", "lakes", "--json") == 1
    assert json.loads(capsys.readouterr().out)["problems"][0]["row"] == 2
