"""Does the fit find a truth it was not told? Made-up elections, refitted from the files a desk would have.

The simulator (``data_demo``) shares no code with the model. Scales, houses, shared lean, regions, rounding
and fieldwork are drawn anew for every election; the seeds were fixed before the first run.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from pathlib import Path

import pytest

from aggregator.estimate.fit import fit_contest
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.settings import RunSettings
from data_demo import make_lake_provinces as lake_provinces
from data_demo.made_up_election import SMALL_ELECTION, UNTIDY_ELECTION
from tests.recovery.whole_refits import Pooled, compare, pool, refit

TINY_ELECTION = replace(SMALL_ELECTION, parties=3, regions=2, polls=35, weeks=26, polled_weeks=24, houses=4)


def test_polling_day_errors_are_as_large_as_stated_over_ten_made_up_elections(tmp_path: Path) -> None:
    found = [
        refit(seed, folder=tmp_path / str(seed), size=TINY_ELECTION, draws=300) for seed in range(201, 211)
    ]
    _assert_calibrated(pool(found))


def test_a_model_without_the_shared_lean_is_caught_being_too_sure(tmp_path: Path) -> None:
    """Negative control: the elections have a shared lean, the model is told there is none."""
    found = [
        refit(seed, folder=tmp_path / str(seed), size=TINY_ELECTION, lean_in_the_model=False, draws=300)
        for seed in range(201, 205)
    ]
    pooled = pool(found)
    assert pooled.chi_square > pooled.band[1]


@pytest.mark.study
def test_forty_small_elections_are_recovered(tmp_path: Path) -> None:
    pooled = pool(refit(seed, folder=tmp_path / str(seed), size=SMALL_ELECTION) for seed in range(1, 41))
    print(f"\nforty small elections: {pooled}")
    _assert_calibrated(pooled)


@pytest.mark.study
def test_ten_whole_elections_are_recovered(tmp_path: Path) -> None:
    """Seven parties, eight regions, nine houses, 250 untidy polls each."""
    pooled = pool(refit(seed, folder=tmp_path / str(seed), size=None) for seed in range(101, 111))
    print(f"\nten whole elections: {pooled}")
    _assert_calibrated(pooled)


@pytest.mark.study
def test_ten_untidy_elections_are_recovered(tmp_path: Path) -> None:
    """Eras, modes, populations, alliances asked as one, a tracker, jolts, a ramp, a region counted early."""
    size = replace(
        UNTIDY_ELECTION, parties=5, regions=4, seats=40, houses=7, polls=90, weeks=120, polled_weeks=40
    )
    pooled = pool(refit(seed, folder=tmp_path / str(seed), size=size, draws=400) for seed in range(401, 411))
    print(f"\nten untidy elections: {pooled}")
    _assert_calibrated(pooled)


@pytest.mark.study
def test_the_demos_release_is_right_about_its_truth() -> None:
    """One election is one draw: its errors must not be larger than stated in all but one of a hundred."""
    inputs = read_contest_folder(Path(lake_provinces.__file__).parent / "lake_provinces", today=date.today())
    fit = fit_contest(inputs, settings=RunSettings())
    pooled = pool([compare(fit, lake_provinces.build_lake_provinces())])
    print(f"\nthe demo: {pooled}; checks passed: {fit.verdict.passed}")
    assert fit.verdict.passed
    _assert_calibrated(pooled)


@pytest.mark.study
def test_ten_small_elections_without_the_shared_lean_are_not(tmp_path: Path) -> None:
    pooled = pool(
        refit(seed, folder=tmp_path / str(seed), size=SMALL_ELECTION, lean_in_the_model=False)
        for seed in range(1, 11)
    )
    print(f"\nten small elections, lean left out: {pooled}")
    assert pooled.chi_square > pooled.band[1]


def _assert_calibrated(pooled: Pooled) -> None:
    low, high = pooled.band
    assert low < pooled.chi_square < high, str(pooled)
