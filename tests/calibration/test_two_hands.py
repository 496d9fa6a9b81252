"""The simulator and the model are two hands that write the same formulas: at the same truth they agree."""

from __future__ import annotations

import numpy as np
import pytest

from aggregator.estimate.parameters import Parameters
from aggregator.estimate.poll_fit import row_log_likelihood
from aggregator.estimate.support import support_of_regions
from tests.calibration.prior_elections import PriorElection, draw_election
from tests.calibration.prior_register import COUNTED, KNOTS, PARTIES, POLLING_DAY, weigh_days
from tests.calibration.ranks import CALENDAR

SEEDS = range(20)


def _as_parameters(election: PriorElection) -> Parameters:
    """The truth as the one draw of a posterior."""
    scales, leans, opinion = election.scales, election.leans, election.opinion
    none = np.zeros((1, len(PARTIES)))
    terms = [leans.houses, leans.eras, leans.modes, leans.populations, leans.formations, none]
    return Parameters(
        drift=scales.drift[None],
        house_scale=scales.house[None],
        lean_scale=scales.shared_lean[None],
        region_ratio=np.array([scales.region_ratio]),
        ramp=np.array([scales.ramp_log_height]),
        walk=opinion.national[None],
        region=opinion.swing[None],
        lean=leans.shared[None],
        terms=np.concatenate(terms)[None],
        kappa=scales.kappa[None],
        rho=scales.rho[None],
    )


@pytest.mark.parametrize("seed", SEEDS)
def test_both_hands_find_the_same_answers_equally_likely(seed: int) -> None:
    """The simulator adds up probabilities from scipy, the model writes log-gamma functions."""
    election = draw_election(np.random.default_rng(seed))
    found = row_log_likelihood(_as_parameters(election), arrays=election.arrays, samples=np.arange(1))
    assert found.sum() == pytest.approx(election.log_likelihood, abs=1e-6)


@pytest.mark.parametrize("seed", SEEDS)
def test_both_hands_find_the_same_support_on_polling_day(seed: int) -> None:
    election = draw_election(np.random.default_rng(seed))
    found = support_of_regions(
        _as_parameters(election),
        arrays=election.arrays,
        calendar=CALENDAR,
        region_lean=np.zeros((1, *election.arrays.country.standing.shape)),
    )[0, -1]
    national, regional = weigh_days(POLLING_DAY, POLLING_DAY)
    expected = election.opinion.by_region(national, regional, beside=np.zeros(len(PARTIES)))
    expected[COUNTED] = election.arrays.counted.share[0] if election.arrays.counted else 0
    np.testing.assert_allclose(found, expected, atol=1e-6)


def test_every_register_has_a_case_of_everything_the_model_knows() -> None:
    for seed in SEEDS:
        arrays = draw_election(np.random.default_rng(seed)).arrays
        arrays.check()
        rows, leans = arrays.rows, arrays.leans
        none = leans.terms_of_row.max()
        assert KNOTS.has_ramp
        assert KNOTS.national_jolt.sum() == KNOTS.region_jolt.sum() > 0
        assert set(range(none)) <= set(leans.terms_of_row.ravel()), "a lean that no row has"
        assert len(rows.row_of_part) > len(rows.respondents), "no row asks a region that has voted"
        assert len(rows.small_row) > 0
        assert rows.weighting_known.any()
        assert (rows.respondents < rows.poll_respondents).any()
        assert (rows.partition.sum(axis=2) > 1).any()
