"""A calibration's folder: page, charts and tables, whole or not there at all."""

from __future__ import annotations

import json
from dataclasses import asdict
from pathlib import Path

import pandas as pd

from aggregator.errors import UsageError
from aggregator.refits.program_version import program_version
from aggregator.release.chart_files import write_charts
from aggregator.release.chart_style import Frame
from aggregator.release.folder import replace_folder
from aggregator.studies.calibration_charts import build_charts
from aggregator.studies.calibration_page import CAUTION, PAGE, build_page, title_of
from aggregator.studies.calibration_report import CalibrationReport

STUDY = "study.json"
"""Tells a calibration's folder from any other, and what was studied."""
DECIMALS = 4


def check_place(place: Path) -> None:
    """Refuse a folder that holds something else than an earlier calibration, which would be replaced.

    Raises
    ------
    UsageError
        If it does.
    """
    if place.exists() and not (place / STUDY).is_file() and (not place.is_dir() or any(place.iterdir())):
        raise UsageError(
            f"{place} holds something that is not a calibration. Name another folder with --out."
        )


def write_calibration(report: CalibrationReport, place: Path) -> None:
    """Write page, charts and tables, in the place of an earlier calibration of that name.

    Raises
    ------
    MachineError
        If the disk is full or cannot be written; an earlier calibration is still there then.
    """

    def fill(folder: Path) -> None:
        for name, table in report_tables(report).items():
            table.round(DECIMALS).to_csv(
                folder / f"{name}.csv", index=False, encoding="utf-8", lineterminator="\n"
            )
        frame = Frame(source=f"{title_of(report)}: {report.plan.size_text}.", caution=CAUTION)
        charts = write_charts(folder / "charts", charts=build_charts(report), frame=frame)
        (folder / PAGE).write_text(build_page(report, charts=charts), encoding="utf-8")
        (folder / STUDY).write_text(
            json.dumps(_about(report), indent=1, ensure_ascii=False) + "\n", encoding="utf-8"
        )

    replace_folder(fill, place=place, what="calibration")


def report_tables(report: CalibrationReport) -> dict[str, pd.DataFrame]:
    """Every table of the folder, by file name without ending."""
    tables = {
        "numbers": report.study.judged,
        "elections": report.study.fits,
        "coverage": report.coverage,
        "scores": report.scores,
        "places": report.uniformity,
        "chances": report.reliability,
        "noticed": report.noticed,
    }
    if report.verdict is not None:
        tables["verdict"] = report.verdict.table
    if report.damage is not None and report.alarms is not None:
        tables |= {"damage": report.damage, "alarms": report.alarms}
    return tables


def _about(report: CalibrationReport) -> dict[str, object]:
    plan = report.plan
    return {
        "title": title_of(report),
        "elections": plan.elections,
        "first_seed": plan.first_seed,
        "size": asdict(plan.size),
        "violation": None if plan.violation is None else plan.violation.name,
        "settings": asdict(plan.settings),
        "passed": None if report.verdict is None else report.verdict.passed,
        "version": program_version(),
    }
