"""A study from end to end without fits: hand-made draws, pooled, judged, written, replaced."""

from __future__ import annotations

import errno
import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

from aggregator.errors import MachineError, UsageError
from aggregator.release.schema_docs import describe_schema
from aggregator.release.table_columns import TableSchema
from aggregator.settings import RunSettings
from aggregator.studies.calibration_charts import build_charts
from aggregator.studies.calibration_page import headlines
from aggregator.studies.calibration_report import (
    CalibrationPlan,
    CalibrationReport,
    build_report,
    judge_calibration,
)
from aggregator.studies.calibration_schemas import CALIBRATION_SCHEMAS
from aggregator.studies.invented_elections import draw_invented_election
from aggregator.studies.judged_elections import JudgedElections, judge_elections
from aggregator.studies.write_calibration import check_place, write_calibration
from data_demo.all_violations import VIOLATIONS
from data_demo.made_up_election import SMALL_ELECTION
from tests.studies.made_up_fits import made_up_pair

TINY = replace(SMALL_ELECTION, parties=3, regions=2, seats=6, polls=25, weeks=26, polled_weeks=24, houses=4)
ELECTIONS = 40
DOCS = Path(__file__).parents[2] / "docs"


@pytest.fixture(scope="module")
def inputs() -> Any:
    return draw_invented_election(4, size=TINY).inputs


def plan(**changes: Any) -> CalibrationPlan:
    return replace(CalibrationPlan(ELECTIONS, 1, TINY, None, RunSettings(draws=150)), **changes)


def study(inputs: Any, *, stated: float = 0.1, monkeypatch: pytest.MonkeyPatch) -> JudgedElections:
    # One register stands for all; the screens have tests of their own.
    nothing = pd.DataFrame({"screen": pd.Series(dtype=object)})
    monkeypatch.setattr("aggregator.studies.noticed.screen_polls", lambda *_args, **_kwargs: nothing)
    return judge_elections(made_up_pair(seed, inputs=inputs, stated=stated) for seed in plan().seeds)


@pytest.fixture
def right(inputs: Any, monkeypatch: pytest.MonkeyPatch) -> CalibrationReport:
    return build_report(plan(), study(inputs, monkeypatch=monkeypatch))


def test_a_right_method_holds_what_it_says(right: CalibrationReport) -> None:
    support = right.coverage.query("group == 'all support' and stated == 90").iloc[0]
    assert support["low"] <= 90 <= support["high"]
    assert right.errors.inside
    assert right.uniformity["inside"].all()


def test_a_method_that_is_too_sure_is_told_so(inputs: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    """Negative control: stated sd half the true one."""
    report = build_report(plan(), study(inputs, stated=0.05, monkeypatch=monkeypatch))
    verdict = judge_calibration(report.coverage, report.uniformity, report.errors)
    assert not verdict.passed
    assert verdict.table.set_index("check")["passed"].tolist() == [False, True, False]
    assert "percent" in verdict.text and "whitened" in verdict.text


def test_forty_elections_are_too_few_for_a_verdict(right: CalibrationReport) -> None:
    assert right.verdict is None
    assert headlines(right)[-1] == "Too few elections for a verdict: it takes 200."


def test_a_violation_is_compared_with_the_same_elections_without_it(
    inputs: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    honest = study(inputs, monkeypatch=monkeypatch)
    sure = study(inputs, stated=0.05, monkeypatch=monkeypatch)
    report = build_report(plan(violation=VIOLATIONS["herding"]), sure, honest=honest)
    assert report.damage is not None and report.verdict is None
    row = report.damage.set_index("group").loc["all support"]
    assert row["inside_violated"] < 75 < row["inside_honest"]
    assert row["width_ratio"] == pytest.approx(0.5, rel=0.05)
    assert row["low"] < row["crps_ratio"] < row["high"] and row["crps_ratio"] > 1
    same = build_report(plan(violation=VIOLATIONS["herding"]), honest, honest=honest).damage
    assert same is not None
    assert (same[["crps_ratio", "low", "high", "error_ratio", "width_ratio"]] == 1).all(axis=None)


def test_a_second_report_takes_the_place_of_the_first(
    right: CalibrationReport, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("aggregator.studies.write_calibration.write_charts", lambda *_, **__: ())
    place = tmp_path / "as_assumed"
    for first_seed in (1, 501):
        check_place(place)
        write_calibration(replace(right, plan=plan(first_seed=first_seed)), place)
    assert json.loads((place / "study.json").read_text(encoding="utf-8"))["first_seed"] == 501
    assert [path.name for path in tmp_path.iterdir()] == ["as_assumed"]


def test_a_report_that_cannot_be_finished_leaves_the_earlier_one(
    right: CalibrationReport, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("aggregator.studies.write_calibration.write_charts", lambda *_, **__: ())
    place = tmp_path / "as_assumed"
    write_calibration(right, place)

    def full(*_args: Any, **_kwargs: Any) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr("aggregator.studies.write_calibration.write_charts", full)
    with pytest.raises(MachineError, match="disk is full"):
        write_calibration(replace(right, plan=plan(first_seed=501)), place)
    assert json.loads((place / "study.json").read_text(encoding="utf-8"))["first_seed"] == 1
    assert [path.name for path in tmp_path.iterdir()] == ["as_assumed"]


def test_the_folder_holds_page_charts_and_tables(right: CalibrationReport, tmp_path: Path) -> None:
    place = tmp_path / "small" / "as_assumed"
    write_calibration(right, place)
    names = {path.name for path in place.iterdir()}
    assert names == {"index.html", "tables", "charts", "study.json"}
    page = (place / "index.html").read_text(encoding="utf-8")
    assert "How often intervals hold the truth" in page and "seeds 1 to 40" in page
    coverage = pd.read_csv(place / "tables" / "coverage.csv")
    assert coverage["stated"].drop_duplicates().tolist() == [50, 80, 90, 95]
    about = json.loads((place / "study.json").read_text(encoding="utf-8"))
    assert (about["elections"], about["first_seed"], about["violation"]) == (40, 1, None)
    written = {path.relative_to(place).as_posix() for path in place.rglob("*") if path.is_file()}
    assert set(about["outputs"]) == written - {"study.json"}


def test_every_table_keeps_its_schema(inputs: Any, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setattr("aggregator.studies.write_calibration.write_charts", lambda *_, **__: ())
    honest = study(inputs, monkeypatch=monkeypatch)
    violated = build_report(plan(violation=VIOLATIONS["herding"]), honest, honest=honest)
    verdict = judge_calibration(violated.coverage, violated.uniformity, violated.errors)
    write_calibration(replace(violated, verdict=verdict), tmp_path / "herding")
    for schema in CALIBRATION_SCHEMAS:
        table = pd.read_csv(tmp_path / "herding" / schema.path, keep_default_na=False)
        assert tuple(table.columns) == schema.column_names


@pytest.mark.parametrize("schema", CALIBRATION_SCHEMAS, ids=lambda schema: schema.path)
def test_formats_describes_every_column_of_every_table(schema: TableSchema) -> None:
    """On a failure, put the text of ``describe_schema`` in the place of the old one."""
    assert describe_schema(schema) in (DOCS / "formats.md").read_text(encoding="utf-8")


def test_a_folder_of_something_else_is_left_alone(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("ours", encoding="utf-8")
    with pytest.raises(UsageError, match="not a calibration"):
        check_place(tmp_path)


def test_there_is_reading_help_for_every_chart(right: CalibrationReport) -> None:
    page = (DOCS / "reading_the_charts.md").read_text(encoding="utf-8")
    own = page[page.index("charts of a calibration") :]
    charts = build_charts(right)
    assert charts
    for chart in charts:
        assert f"## `{chart.name}`" in own
