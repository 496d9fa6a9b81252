"""The likelihood of published figures, against the distributions of scipy."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import gammaln
from scipy.stats import betabinom, dirichlet_multinomial

from models.arrays import RowArrays
from models.design_effect import row_design_effect
from models.poll_answers import (
    MOST_COUNTS,
    answer_precision,
    answers_log_density,
    cell_shares,
    small_cells_log_density,
    small_counts,
)
from tests.models.made_up_arrays import made_up_arrays


def _log_density(answers: np.ndarray, share: np.ndarray, precision: float) -> float:
    return float(
        answers_log_density(
            answers[None],
            cells=share[None],
            precision=np.array([precision]),
            kept=np.ones((1, len(share))),
            log_gamma=gammaln,
        )[0]
    )


@given(seed=st.integers(0, 5000))
def test_answers_are_dirichlet_multinomial_up_to_the_coefficient(seed: int) -> None:
    """``scipy.stats.dirichlet_multinomial``."""
    rng = np.random.default_rng(seed)
    share, other, precision = rng.dirichlet(np.ones(4)), rng.dirichlet(np.ones(4)), rng.uniform(20, 2000)
    answers = rng.multinomial(800, share).astype(float)
    ours = _log_density(answers, share, precision) - _log_density(answers, other, precision)
    exact = [dirichlet_multinomial.logpmf(answers.astype(int), precision * s, 800) for s in (share, other)]
    assert ours == pytest.approx(exact[0] - exact[1], rel=1e-6, abs=1e-6)


@given(n=st.floats(300, 5000), deff=st.floats(1.05, 4))
def test_the_variance_of_a_share_is_the_binomials_times_the_design_effect(n: float, deff: float) -> None:
    """Variance of ``scipy.stats.dirichlet_multinomial`` at our precision."""
    share, n = np.array([0.3, 0.5, 0.2]), round(n)
    precision = float(answer_precision(respondents=n, design_effect=deff, larger=np.maximum))
    variance = np.diag(dirichlet_multinomial.cov(precision * share, n)) / n**2
    np.testing.assert_allclose(variance, share * (1 - share) * deff / n, rtol=1e-9)


@given(seed=st.integers(0, 5000))
def test_reporting_two_parties_as_one_sums_over_how_they_split(seed: int) -> None:
    """Merging cells is exact: the merged figure's likelihood is that of the sum."""
    rng = np.random.default_rng(seed)
    share, other, precision = rng.dirichlet(np.ones(3)), rng.dirichlet(np.ones(3)), rng.uniform(20, 500)
    answers = rng.multinomial(30, share)

    def merged(of: np.ndarray) -> float:
        together = np.array([answers[0], answers[1] + answers[2]], dtype=float)
        return _log_density(together, np.array([of[0], of[1] + of[2]]), precision)

    def summed(of: np.ndarray) -> float:
        splits = [
            dirichlet_multinomial.logpmf([answers[0], k, answers[1] + answers[2] - k], precision * of, 30)
            for k in range(answers[1] + answers[2] + 1)
        ]
        return float(np.logaddexp.reduce(splits))

    assert merged(share) - merged(other) == pytest.approx(summed(share) - summed(other), abs=1e-7)


@pytest.mark.parametrize(("low", "high"), [(0, 5), (3, 11), (10, 21)])
def test_a_figure_below_two_steps_has_the_probability_of_its_interval(low: int, high: int) -> None:
    """``scipy.stats.betabinom``: exact where every count is summed, within .5 % where counts are sampled."""
    n, precision, share = 1000.0, 700.0, 0.011
    rows = _rows_with_small(n=n, low=float(low), high=float(high))
    small = small_counts(rows)
    ours = small_cells_log_density(
        small.counts,
        log_count_weight=small.log_count_weight,
        weight=np.array([precision * share]),
        precision=np.array([precision]),
        respondents=np.array([n]),
        log_gamma=gammaln,
        exp=np.exp,
        log=np.log,
    )[0]
    exact = betabinom(int(n), precision * share, precision * (1 - share))
    probability = exact.cdf(high) - (exact.cdf(low - 1) if low else 0)
    assert np.exp(ours) == pytest.approx(probability, rel=1e-8 if high - low < MOST_COUNTS else 5e-3)


def test_figures_without_a_remainder_are_read_as_shares_among_the_codes_given() -> None:
    share = np.array([[0.4, 0.4, 0.2]])
    partition = np.array([[[1, 0, 0], [0, 1, 0]]], dtype=float)
    cells = cell_shares(share, partition=partition, used=np.ones((1, 2)))
    np.testing.assert_allclose(cells, [[0.5, 0.5]])


def test_a_poll_entered_as_its_regional_rows_weighs_the_same() -> None:
    kappa, rho = np.array([1.5]), np.array([0.0005])

    def weight(parts: np.ndarray) -> float:
        deff = row_design_effect(
            kappa=kappa,
            rho=rho,
            house_of_row=np.zeros(len(parts), dtype=int),
            poll_respondents=np.full(len(parts), parts.sum()),
            weighting_known=np.zeros(len(parts)),
        )
        return float((parts / deff).sum())

    whole = weight(np.array([5000.0]))
    assert weight(np.full(8, 5000 / 8)) == pytest.approx(whole)
    assert weight(np.full(36, 5000 / 36)) == pytest.approx(whole)


def test_a_given_effective_sample_leaves_no_weighting_loss_to_learn() -> None:
    deff = row_design_effect(
        kappa=np.array([1.5]),
        rho=np.array([0.0005]),
        house_of_row=np.array([0]),
        poll_respondents=np.array([801.0]),
        weighting_known=np.array([1.0]),
    )
    assert deff[0] == pytest.approx(1 + 800 * 0.0005)


def _rows_with_small(*, n: float, low: float, high: float) -> RowArrays:
    rows = made_up_arrays(polls=3)[0].rows
    return replace(
        rows,
        respondents=np.full(3, n),
        small_row=np.array([0]),
        small_cell=np.array([0]),
        small_low=np.array([low]),
        small_high=np.array([high]),
    )
