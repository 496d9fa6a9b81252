"""Other assumptions about the shared lean, from one fit's draws: what a fit under them would have said."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from pathlib import Path

import numpy as np
import pytest

from aggregator.estimate.fit import Fit, fit_contest
from aggregator.estimate.lean_alternatives import CORRELATION, SIZE, lean_alternatives
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.settings import RunSettings
from data_demo.made_up_election import SMALL_ELECTION, simulate_election
from data_demo.made_up_folder import write_contest_folder

# Polls from soon after the last election on: what the lean was then, and carries over, matters.
EARLY_POLLS = replace(SMALL_ELECTION, parties=3, regions=2, polls=40, weeks=30, polled_weeks=28, houses=4)


def _fit(folder: Path, *, model: str = "") -> tuple[DeskInputs, Fit]:
    write_contest_folder(simulate_election(3, size=EARLY_POLLS), folder)
    contest = folder / "contest.toml"
    contest.write_text(contest.read_text(encoding="utf-8") + f"\n[model]\n{model}\n", encoding="utf-8")
    inputs = read_contest_folder(folder, today=date(2100, 1, 1))
    return inputs, fit_contest(inputs, settings=RunSettings(seed=1, draws=700), second_attempts=False)


@pytest.fixture(scope="module")
def run(tmp_path_factory: pytest.TempPathFactory) -> tuple[DeskInputs, Fit]:
    return _fit(tmp_path_factory.mktemp("contest"))


def test_draws_carried_to_another_correlation_agree_with_a_fit_that_assumes_it(
    run: tuple[DeskInputs, Fit], tmp_path: Path
) -> None:
    moved = next(a for a in lean_alternatives(*run, rng=np.random.default_rng(1)) if a.setting == "2/3")
    _, refit = _fit(tmp_path, model="shared_lean_correlation = 0.6666667")
    assert moved.pareto_k < 0.7
    assert moved.draws is not None
    name = "national_support_polling_day"
    ours, theirs = moved.draws[name], refit.draws[name]
    sd = theirs.std(("chain", "draw"))
    # Both are Monte Carlo: a tenth of an sd is three standard errors of some 1,000 effective draws.
    gap = (ours.mean(("chain", "draw")) - theirs.mean(("chain", "draw"))) / sd
    np.testing.assert_array_less(np.abs(gap), 0.15)
    np.testing.assert_allclose(ours.std(("chain", "draw")) / sd, 1, atol=0.12)


def test_the_setting_in_use_is_the_release_itself_and_no_lean_is_much_narrower(
    run: tuple[DeskInputs, Fit],
) -> None:
    inputs, fit = run
    found = lean_alternatives(inputs, fit, rng=np.random.default_rng(1))
    assert [(a.assumption, a.setting) for a in found if a.in_use] == [(CORRELATION, "1/3"), (SIZE, "in use")]
    name = "national_support_polling_day"
    for alternative in found:
        assert alternative.draws is not None
        np.testing.assert_allclose(alternative.draws[name].sum("party"), 1, atol=1e-5)
        if alternative.in_use:
            assert alternative.draws[name].equals(fit.draws[name])
    none = found[-1].draws
    assert none is not None
    largest = fit.draws[name].mean(("chain", "draw")).idxmax("party")
    narrower = none[name].sel(party=largest).std() / fit.draws[name].sel(party=largest).std()
    assert narrower < 0.8
