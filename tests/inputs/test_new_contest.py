"""A new contest is whole, explained, and usable as it is."""

from __future__ import annotations

import re
import tomllib
from datetime import date, timedelta

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from aggregator.errors import MachineError, UsageError
from aggregator.inputs import new_contest as module
from aggregator.inputs.contest import (
    Alliance,
    Contest,
    Counting,
    Jolt,
    LastResult,
    ModelOverrides,
    Party,
    Region,
    ReleaseRules,
    Silence,
)
from aggregator.inputs.contest_file import known_keys, read_contest
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.counting_terms import CountingWhere
from aggregator.inputs.new_contest import new_contest
from aggregator.inputs.register_columns import REGISTER_COLUMNS, RESULT_COLUMNS

TODAY = date(2031, 3, 5)


@settings(max_examples=20, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(day=st.dates(date(2024, 1, 1), date(2040, 12, 31)))
def test_a_new_contest_can_be_used_on_the_day_it_is_made(day, tmp_path_factory):
    folder = tmp_path_factory.mktemp("new") / "lakes"
    new_contest(folder, today=day)
    inputs = read_contest_folder(folder, today=day)
    assert inputs.warnings == ()
    assert inputs.run_date == day
    assert inputs.contest.polling_day > day
    assert inputs.contest.counting.seats == 12
    assert len(inputs.polls) == 12
    assert len(inputs.unused_polls) == 2


def test_a_new_contest_still_reads_when_its_polling_day_has_passed(tmp_path):
    new_contest(tmp_path / "lakes", today=TODAY)
    later = read_contest_folder(tmp_path / "lakes", today=TODAY + timedelta(days=400))
    assert later.run_date == later.polls["published"].max().date()


def test_every_key_is_explained(tmp_path):
    text = new_contest(tmp_path / "lakes", today=TODAY)[0].read_text(encoding="utf-8")
    for model in (
        Contest, Party, Alliance, Region, LastResult, Jolt, Counting, CountingWhere, ReleaseRules, Silence,
        ModelOverrides,
    ):  # fmt: skip
        for key in known_keys(model):
            assert re.search(rf"\b{key}\b", text), key


def test_every_key_that_stands_in_a_remark_can_be_used(tmp_path):
    text = new_contest(tmp_path / "lakes", today=TODAY)[0].read_text(encoding="utf-8")
    loose = re.sub(r"^# (?=\w+ = |\[\[)", "", text, flags=re.MULTILINE)
    assert len(tomllib.loads(loose)["release"]["silence"]) == 1
    contest, problems = read_contest(loose.encode())
    assert problems == []
    assert contest is not None


def test_every_column_stands_in_the_header(tmp_path):
    _, polls, result = new_contest(tmp_path / "lakes", today=TODAY)
    assert set(REGISTER_COLUMNS) <= set(polls.read_text(encoding="utf-8").splitlines()[0].split(","))
    assert set(RESULT_COLUMNS) <= set(result.read_text(encoding="utf-8").splitlines()[0].split(","))


def test_an_empty_folder_is_taken(tmp_path):
    folder = tmp_path / "lakes"
    folder.mkdir()
    assert [p.name for p in new_contest(folder, today=TODAY)] == sorted(p.name for p in folder.iterdir())


@pytest.mark.parametrize("kind", ["folder", "file"])
def test_nothing_that_is_there_is_touched(kind, tmp_path):
    folder = tmp_path / "lakes"
    if kind == "folder":
        folder.mkdir()
        (folder / "mine.txt").write_text("mine")
    else:
        folder.write_text("mine")
    with pytest.raises(UsageError, match="name a folder that does not exist yet"):
        new_contest(folder, today=TODAY)
    assert [p.name for p in tmp_path.rglob("*")] == (["lakes", "mine.txt"] if kind == "folder" else ["lakes"])


def test_nothing_half_written_stays_behind(tmp_path, monkeypatch):
    def fail(self, target):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(module.Path, "replace", fail)
    with pytest.raises(MachineError, match="cannot be written: No space left on device"):
        new_contest(tmp_path / "lakes", today=TODAY)
    assert list(tmp_path.iterdir()) == []
