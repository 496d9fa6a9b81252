"""What the command for replays prints, and the code it leaves with."""

from __future__ import annotations

import json
from datetime import date, timedelta
from pathlib import Path

import pytest

from aggregator.errors import MachineError
from aggregator.refits.pace import FitCosts
from aggregator.replays.replay import ReplayOutcome
from aggregator.replays.replay_dates import ReplaySpan
from tests.test_cli import run


def outcome(*, failed: int = 0, pages: bool = True, workers: int = 2) -> ReplayOutcome:
    return ReplayOutcome(
        out=Path("lakes/replays/a_b"),
        contests=("lakes",),
        dates=26,
        made=20,
        pages=(Path("lakes/replays/a_b/report/index.html"),) if pages else (),
        past_errors=None,
        failed=tuple(("lakes", date(2031, 4, k + 1)) for k in range(failed)),
        costs=FitCosts(fits=26, first_seconds=62, next_seconds=30, sampling_part=0.831),
        workers=workers,
        warnings=(),
        notices=() if pages else ("lakes: no result_outcome.csv, so its fits are kept and not scored.",),
    )


@pytest.fixture
def asked(monkeypatch: pytest.MonkeyPatch):
    """Let the command meet a result or an error in place of a replay; what it asked for."""

    def meet(result: ReplayOutcome | BaseException) -> dict[str, object]:
        found: dict[str, object] = {}

        def replay(folder: Path, **options: object) -> ReplayOutcome:
            found.update(options, folder=folder)
            if isinstance(result, BaseException):
                raise result
            return result

        monkeypatch.setattr("aggregator.replays.replay.replay", replay)
        return found

    return meet


def test_a_replay_says_what_it_made_what_a_fit_took_and_what_a_thousand_would(asked, capsys):
    asked(outcome())
    assert run("replay", "lakes") == 0
    said = capsys.readouterr()
    assert said.out == (
        "26 fits, 20 of them made now.\n"
        "A fit took 30 s, 62 s where its worker had to compile; chains ran for 83 % of the time.\n"
        "A thousand such fits would take about 4 h 11 min on 2 workers, 32 min on 16 workers.\n"
        "lakes/replays/a_b/report/index.html\n"
    )


def test_options_reach_the_replay(asked):
    found = asked(outcome())
    run(
        "replay", "lakes", "--every", "2w", "--from", "2031-01-01", "--to", "3d", "--out", "o", "--seed", 7,
        "--draws", 300, "--scheduler", "tls://a:1", "--past-errors", "r.csv", "--quiet",
    )  # fmt: skip
    assert found["span"] == ReplaySpan(timedelta(14), date(2031, 1, 1), timedelta(3))
    assert (found["settings"].seed, found["settings"].draws) == (7, 300)
    assert (found["out"], found["scheduler"], found["past_errors"]) == (Path("o"), "tls://a:1", Path("r.csv"))


def test_dates_whose_checks_failed_are_named_and_leave_with_3(asked, capsys):
    asked(outcome(failed=7, pages=False))
    assert run("replay", "lakes", "--quiet") == 3
    said = capsys.readouterr()
    assert said.err == (
        "lakes: no result_outcome.csv, so its fits are kept and not scored.\n"
        "Checks failed on 2031-04-01, 2031-04-02, 2031-04-03, 2031-04-04, 2031-04-05, … (7 in total): "
        "run again with more --draws.\n"
    )
    assert said.out.endswith("lakes/replays/a_b\n")


def test_json_alone_owns_standard_output(asked, capsys):
    asked(outcome(failed=1, workers=0))
    assert run("replay", "lakes", "--json") == 3
    record = json.loads(capsys.readouterr().out)
    assert (record["fits"], record["fits_made_now"], record["workers"]) == (26, 20, 0)
    assert record["failed"] == [{"contest": "lakes", "date": "2031-04-01"}]


@pytest.mark.parametrize(
    ("trouble", "code", "message"),
    [
        (MachineError("No Dask scheduler answers."), 5, "fieldfold: No Dask scheduler answers.\n"),
        (KeyboardInterrupt(), 130, "finished fits are kept, and the same command goes on from them.\n"),
    ],
)
def test_what_stops_a_replay_is_said_in_a_sentence(asked, capsys, trouble, code, message):
    asked(trouble)
    assert run("replay", "lakes", "--quiet") == code
    assert capsys.readouterr().err.endswith(message)


def test_a_step_of_nothing_is_wrong_usage(capsys):
    assert run("replay", "lakes", "--every", "0d") == 2
    assert "--every 0d: give a number of days or weeks above zero" in capsys.readouterr().err
