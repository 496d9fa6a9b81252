"""The command of a study: what its help names, and what it refuses."""

from __future__ import annotations

from pathlib import Path

import pytest
from typer.testing import CliRunner

from aggregator.cli import app
from aggregator.errors import UsageError
from aggregator.studies.named_studies import SIZES
from data_demo.all_violations import VIOLATIONS


def test_the_help_names_every_size_and_every_violation() -> None:
    shown = CliRunner().invoke(app, ["study", "calibrate", "--help"]).stdout
    for name in (*SIZES, *VIOLATIONS):
        assert name in shown, name


@pytest.mark.parametrize(("option", "words"), [("--size", "small"), ("--violation", "herding")])
def test_an_unknown_name_is_refused_with_those_there_are(option: str, words: str, tmp_path: Path) -> None:
    call = ["study", "calibrate", "--out", str(tmp_path / "study"), option, "nonsense"]
    result = CliRunner().invoke(app, call)
    assert isinstance(result.exception, UsageError)
    assert words in str(result.exception)
    assert not (tmp_path / "study").exists()
