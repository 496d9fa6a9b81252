"""What a refresh refuses, it refuses before the fit."""

from __future__ import annotations

from datetime import date

import pytest

from aggregator import weekly_run
from aggregator.errors import UsageError
from aggregator.inputs.new_contest import new_contest

TODAY = date(2031, 4, 2)


def test_a_place_that_holds_something_is_refused_before_the_fit(tmp_path, monkeypatch):
    def fit_contest(*_arguments, **_options):
        pytest.fail("the fit was started")

    monkeypatch.setattr(weekly_run, "fit_contest", fit_contest)
    contest, taken = tmp_path / "lakes", tmp_path / "taken"
    new_contest(contest, today=TODAY)
    taken.mkdir()
    (taken / "notes.txt").write_text("kept")
    with pytest.raises(UsageError, match="already holds something"):
        weekly_run.refresh(contest, out=taken, today=TODAY)
    assert [path.name for path in taken.iterdir()] == ["notes.txt"]
