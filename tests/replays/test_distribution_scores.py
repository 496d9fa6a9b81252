"""Places and intervals of the truth among draws."""

import numpy as np
import pytest
from scipy.stats import kstest

from aggregator.replays.distribution_scores import central_intervals, place_of_truth, score_crps, score_log


def test_places_are_uniform_when_truth_and_draws_come_from_one_source_even_for_small_whole_numbers():
    rng = np.random.default_rng(1)
    draws, truth = rng.poisson(0.7, (99, 4_000)).astype(float), rng.poisson(0.7, 4_000).astype(float)
    assert kstest(place_of_truth(draws, truth, rng=rng), "uniform").pvalue > 0.01


def test_places_show_draws_that_are_too_sure():
    rng = np.random.default_rng(2)
    draws, truth = rng.normal(0, 0.5, (99, 2_000)), rng.normal(size=2_000)
    assert kstest(place_of_truth(draws, truth, rng=rng), "uniform").pvalue < 1e-6


def test_intervals_hold_their_share_and_those_of_whole_numbers_have_whole_ends_and_hold_no_less():
    rng = np.random.default_rng(3)
    draws, truth = rng.normal(size=(400, 3_000)), rng.normal(size=3_000)
    for percent, (low, high) in central_intervals(draws, whole=False).items():
        assert np.mean((low <= truth) & (truth <= high)) == pytest.approx(percent / 100, abs=0.03)
    draws, truth = rng.poisson(5, (400, 3_000)).astype(float), rng.poisson(5, 3_000)
    for percent, (low, high) in central_intervals(draws, whole=True).items():
        assert (low == low.round()).all() and (high == high.round()).all()
        assert np.mean((low <= truth) & (truth <= high)) > percent / 100 - 0.01


def test_crps_of_one_number_is_its_absolute_error():
    assert score_crps(np.full((50, 1), 4.0), np.array([7.0])) == pytest.approx([3.0])


def test_the_log_score_of_seats_is_finite_when_all_draws_agree_and_are_wrong():
    score = score_log(np.zeros((100, 1)), np.array([30.0]), least_bandwidth=0.5)
    assert np.isfinite(score).all()
    assert score[0] > 100


def test_constant_shares_have_no_log_score():
    assert np.isnan(score_log(np.full((100, 1), 2.0), np.array([2.0]))).all()
