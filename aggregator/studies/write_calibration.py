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
from aggregator.release.manifest import file_hash
from aggregator.release.table_columns import ColumnType, TableSchema
from aggregator.release.table_files import round_table, write_table
from aggregator.studies.calibration_charts import build_charts
from aggregator.studies.calibration_page import CAUTION, PAGE, build_page, title_of
from aggregator.studies.calibration_report import CalibrationReport
from aggregator.studies.calibration_schemas import (
    ALARMS,
    CHANCES,
    CHECKS,
    COVERAGE,
    DAMAGE,
    FITS,
    NOTICED,
    NUMBERS,
    PLACES,
    SCORES,
)

STUDY = "study.json"
"""Tells a calibration's folder from any other, and what was studied."""


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
        for schema, table in report_tables(report):
            rounded = round_table(_in_words(table, schema=schema), schema=schema)
            write_table(folder, table=rounded, schema=schema, caution=None)
        frame = Frame(source=f"{title_of(report)}: {report.plan.size_text}.", caution=CAUTION)
        charts = write_charts(folder / "charts", charts=build_charts(report), frame=frame)
        (folder / PAGE).write_text(build_page(report, charts=charts), encoding="utf-8")
        (folder / STUDY).write_text(
            json.dumps(_about(report, folder), indent=1, ensure_ascii=False) + "\n", encoding="utf-8"
        )

    replace_folder(fill, place=place, what="calibration")


def report_tables(report: CalibrationReport) -> list[tuple[TableSchema, pd.DataFrame]]:
    """Every table of the folder beside its schema."""
    tables = [
        (NUMBERS, report.study.judged),
        (FITS, report.study.fits),
        (COVERAGE, report.coverage),
        (SCORES, report.scores),
        (PLACES, report.uniformity),
        (CHANCES, report.reliability),
        (NOTICED, report.noticed),
    ]
    if report.verdict is not None:
        tables.append((CHECKS, report.verdict.table))
    if report.damage is not None and report.alarms is not None:
        tables += [(DAMAGE, report.damage), (ALARMS, report.alarms)]
    return tables


def _in_words(table: pd.DataFrame, *, schema: TableSchema) -> pd.DataFrame:
    """Write true and false as the schema does: yes or no, 1 or 0."""
    words = {c.name: {True: "yes", False: "no"} for c in schema.columns if c.type is ColumnType.YES_NO}
    return table.assign(**{name: table[name].map(word) for name, word in words.items()})


def _about(report: CalibrationReport, folder: Path) -> dict[str, object]:
    """What was studied, with what, and the hashes of what came out."""
    plan = report.plan
    files = sorted(path for path in folder.rglob("*") if path.is_file())
    return {
        "title": title_of(report),
        "elections": plan.elections,
        "first_seed": plan.first_seed,
        "size": asdict(plan.size),
        "violation": None if plan.violation is None else plan.violation.name,
        "settings": asdict(plan.settings),
        "passed": None if report.verdict is None else report.verdict.passed,
        "version": program_version(),
        "outputs": {path.relative_to(folder).as_posix(): file_hash(path) for path in files},
    }
