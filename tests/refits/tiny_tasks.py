"""A tiny invented election and its fits: a second each once a process has compiled."""

from __future__ import annotations

from dataclasses import replace
from datetime import date, timedelta
from pathlib import Path

from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.refits.fit_record import FitRecord
from aggregator.refits.fit_task import FitTask, build_task
from aggregator.settings import RunSettings
from data_demo.made_up_election import SMALL_ELECTION, simulate_election
from data_demo.made_up_folder import write_contest_folder

TINY_ELECTION = replace(
    SMALL_ELECTION, parties=3, regions=2, seats=12, polls=35, weeks=26, polled_weeks=24, houses=4
)
SHORT = RunSettings(seed=5, chains=2, tune=100, draws=100)
DAYS_BEFORE = (60, 46, 1)
RUN_BY_RUN = ("seconds", "reused_compilation")
"""Facts that say how a fit went, not what it found."""


def write_tiny_contest(folder: Path) -> Path:
    write_contest_folder(simulate_election(1, size=TINY_ELECTION), folder)
    return folder


def tiny_inputs(folder: Path, *, days_before: int) -> DeskInputs:
    polling_day = date(2030, 6, 2)
    return read_contest_folder(
        folder, as_of=polling_day - timedelta(days=days_before), today=polling_day + timedelta(days=1)
    )


def tiny_tasks(folder: Path) -> list[FitTask]:
    """Fits of three dates."""
    return [
        build_task(tiny_inputs(folder, days_before=days), name="tiny", settings=SHORT) for days in DAYS_BEFORE
    ]


def assert_same(one: FitRecord, other: FitRecord) -> None:
    """Assert that two records agree in every byte but those that tell how long the fit took."""
    assert one.key == other.key
    assert one.data.identical(other.data)
    assert {k: v for k, v in one.facts.items() if k not in RUN_BY_RUN} == {
        k: v for k, v in other.facts.items() if k not in RUN_BY_RUN
    }
