"""Pooled intervals: hand values, and a bootstrap that draws elections, held against theory."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from scipy.stats import binom, norm

from aggregator.studies.coverage import groups_of, ratio_interval, summarise_coverage, summarise_scores
from aggregator.studies.invented_elections import Quantity


def judged(inside: np.ndarray, *, estimate: float = 20.0) -> pd.DataFrame:
    """Numbers of support on polling day, inside their 90 % interval or not, dims (election, number)."""
    elections, numbers = inside.shape
    table = pd.DataFrame(
        {
            "election": np.repeat(np.arange(elections), numbers),
            "quantity": str(Quantity.SUPPORT_POLLING_DAY),
            "region": "",
            "code": np.tile([f"P{k}" for k in range(numbers)], elections),
            "estimate": estimate,
            "truth": estimate + 1,
            "crps": 0.5,
            "place": 0.5,
        }
    )
    for percent in (50, 80, 90, 95):
        table[f"inside_{percent}"] = inside.ravel()
        table[f"width_{percent}"] = percent / 10
    return table


def test_pooled_coverage_and_scores_are_those_worked_out_by_hand() -> None:
    inside = np.array([[True, True, True, False], [True, True, False, False]])
    coverage = summarise_coverage(judged(inside), rng=np.random.default_rng(0))
    row = coverage[(coverage["group"] == "all support") & (coverage["stated"] == 90)].iloc[0]
    assert (row["inside"], row["elections"], row["intervals"]) == (62.5, 2, 8)
    # Two elections drawn again give 50, 62.5 or 75 %.
    assert (row["low"], row["high"]) == (50, 75)
    scores = summarise_scores(judged(inside)).set_index("group").loc["all support"]
    assert (scores["mean_absolute_error"], scores["crps"], scores["width_90"]) == (1.0, 0.5, 9.0)


def test_a_single_election_has_no_interval() -> None:
    coverage = summarise_coverage(judged(np.array([[True, False]])), rng=np.random.default_rng(0))
    assert coverage[["low", "high"]].isna().all(axis=None)


def test_the_bootstrap_of_independent_numbers_is_the_binomials() -> None:
    rng = np.random.default_rng(3)
    hits = rng.binomial(1, 0.9, size=400).astype(float)
    low, high = ratio_interval(hits, np.ones(400), rng=rng)
    expected = binom.ppf([0.025, 0.975], 400, hits.mean()) / 400
    assert (low, high) == pytest.approx(tuple(expected), abs=0.006)


def test_numbers_that_share_their_election_count_as_one() -> None:
    """Twenty numbers that are all right or all wrong tell no more than one."""
    rng = np.random.default_rng(4)
    whole = np.repeat(rng.random((300, 1)) < 0.9, 20, axis=1)
    apart = rng.random((300, 20)) < 0.9

    for inside, independent in ((whole, 300), (apart, 6000)):
        coverage = summarise_coverage(judged(inside), rng=np.random.default_rng(0))
        row = coverage[(coverage["group"] == "all support") & (coverage["stated"] == 90)].iloc[0]
        expected = 2 * 1.96 * 100 * np.sqrt(inside.mean() * (1 - inside.mean()) / independent)
        assert row["high"] - row["low"] == pytest.approx(expected, rel=0.1)


def test_bootstrap_intervals_hold_the_true_coverage_about_as_often_as_they_say() -> None:
    rng = np.random.default_rng(5)
    held = 0
    for _ in range(100):
        # Elections differ: some are foretold well, some badly.
        chance = rng.beta(9, 1, size=80)
        hits = rng.binomial(15, chance).astype(float)
        low, high = ratio_interval(hits, np.full(80, 15.0), rng=rng)
        held += low <= 0.9 <= high
    assert held >= norm.ppf(0.005, 95, np.sqrt(100 * 0.95 * 0.05)) - 1


def test_every_number_of_support_lies_in_one_band_of_size() -> None:
    table = pd.concat([judged(np.ones((3, 2), bool), estimate=e) for e in (2.0, 5.0, 14.0, 29.0, 60.0)])
    groups = groups_of(table)
    sizes = [len(rows) for name, rows in groups.items() if "estimates" in name]
    assert sizes == [6, 12, 6, 6]
    assert "seats" not in groups
