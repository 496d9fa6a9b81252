"""A calibration from the seed to the page, through real fits; and names a command may use."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pandas as pd
import pytest

from aggregator.errors import UsageError
from aggregator.settings import RunSettings
from aggregator.studies.calibrate import run_calibration
from aggregator.studies.named_studies import size_called, violation_called
from data_demo.all_violations import VIOLATIONS
from data_demo.made_up_election import SMALL_ELECTION

MINIATURE = replace(
    SMALL_ELECTION, parties=3, regions=2, seats=6, polls=25, weeks=26, polled_weeks=24, houses=4
)
ROUGH = RunSettings(chains=2, tune=200, draws=150)
# Fixed before the first run.
FIRST_SEED, ELECTIONS = 401, 6


def test_a_miniature_calibration_with_a_violation_goes_the_whole_way(tmp_path: Path) -> None:
    """Six elections, with late swings and without, and a second run that makes no fit again."""
    stages: list[str] = []
    report = run_calibration(
        elections=ELECTIONS,
        first_seed=FIRST_SEED,
        size=MINIATURE,
        violation=VIOLATIONS["late_swing"],
        out=tmp_path,
        settings=ROUGH,
        progress=lambda stage, _part: stages.append(stage),
    )
    fits = sorted((tmp_path / "fits").iterdir())
    # A swing after the last poll changes nothing that a desk knows: one fit serves both.
    assert len(fits) == ELECTIONS
    assert (tmp_path / "late_swing" / "index.html").is_file()
    assert any("left" in stage for stage in stages)
    judged = report.study.judged
    # Four codes: the country and two regions on polling day, the country today, seats.
    assert len(judged) == ELECTIONS * 4 * 5
    # Shares sum to one and seats to the chamber, in estimates as in truths.
    for quantity, total in (("support_polling_day", 100), ("support_today", 100), ("seats", 6)):
        sums = judged[judged["quantity"] == quantity].groupby(["election", "region"])[["estimate", "truth"]]
        assert sums.sum().to_numpy() == pytest.approx(total, rel=1e-4)
    # Nothing is asked of six elections' intervals but that they are no disaster.
    wide = report.coverage.query("group == 'support today, country' and stated == 95").iloc[0]
    assert wide["inside"] >= 60
    assert report.verdict is None and report.damage is not None and report.alarms is not None
    before = {path: path.stat().st_mtime_ns for path in fits}
    again = run_calibration(
        elections=ELECTIONS, first_seed=FIRST_SEED, size=MINIATURE, out=tmp_path, settings=ROUGH
    )
    assert {path: path.stat().st_mtime_ns for path in fits} == before
    assert sorted((tmp_path / "fits").iterdir()) == fits
    today = report.study.judged.query("quantity == 'support_today'")
    pd.testing.assert_frame_equal(today, again.study.judged.query("quantity == 'support_today'"))


def test_sizes_and_violations_have_names() -> None:
    assert size_called("small") == SMALL_ELECTION
    assert violation_called("herding").name == "herding"
    with pytest.raises(UsageError, match="small, whole, untidy"):
        size_called("huge")
    with pytest.raises(UsageError, match="late_swing, herding, false_house"):
        violation_called("fraud")


def test_a_folder_of_something_else_is_refused_before_anything_is_fitted(tmp_path: Path) -> None:
    (tmp_path / "as_assumed").mkdir()
    (tmp_path / "as_assumed" / "notes.txt").write_text("ours", encoding="utf-8")
    with pytest.raises(UsageError, match="not a calibration"):
        run_calibration(elections=1, first_seed=1, size=MINIATURE, out=tmp_path)
    assert not (tmp_path / "fits").exists()
