"""How much of a number is data and how much assumption, against exact normal distributions."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import xarray as xr
from scipy.integrate import quad
from scipy.stats import norm

from aggregator.estimate.log_density import Layout
from aggregator.estimate.prior_sensitivity import (
    POLLS,
    PRIOR,
    SHARED_LEAN,
    explained_part,
    log_prior_terms,
    measure_sensitivity,
    word_sensitivity,
)
from models.priors import Priors

CHAINS, DRAWS = 4, 2000
# One number θ with prior N(0, 1) and one measurement of it, 2.5 with variance .5: posterior N(5/3, 1/3).
MEASURED, VARIANCE = 2.5, 0.5


def posterior(*, prior_power: float = 1.0, likelihood_power: float = 1.0) -> tuple[float, float]:
    precision = prior_power + likelihood_power / VARIANCE
    return likelihood_power * MEASURED / VARIANCE / precision, precision**-0.5


def exact_sensitivity(part: str, theta: np.ndarray) -> float:
    """Power-scaling sensitivity of Kallioinen et al. (2024), equations 5 to 9, by numerical integration.

    The cumulative Jensen–Shannon divergence of Nguyen & Vreeken (2015), its root normalised as the paper
    has it; the larger of both directions of the number line, per doubling of α. The norm, the sum of the
    integrals of both distribution functions, is taken over the range of the draws, as there.
    """
    low, high = theta.min(), theta.max()

    def halves(alpha: float) -> float:
        old, new = norm(*posterior()), norm(*posterior(**{part: alpha}))

        def divergence(sign: float) -> float:
            def both(x: float) -> tuple[float, float]:
                return (old.cdf(x), new.cdf(x)) if sign > 0 else (old.sf(x), new.sf(x))

            def kl(x: float) -> float:
                p, q = both(x)
                return p * np.log2(2 * p / (p + q)) + q * np.log2(2 * q / (p + q)) if min(p, q) > 0 else 0.0

            bound = quad(lambda x: sum(both(x)), low, high)[0]
            return quad(kl, low, high)[0] / bound

        return np.sqrt(max(divergence(1), divergence(-1))) / abs(np.log2(alpha))

    return (halves(0.99) + halves(1.01)) / 2


@pytest.fixture(scope="module")
def theta() -> np.ndarray:
    mean, sd = posterior()
    return np.random.default_rng(1).normal(mean, sd, (CHAINS, DRAWS))


def numbers(**values: np.ndarray) -> xr.Dataset:
    return xr.Dataset({name: (("chain", "draw"), value) for name, value in values.items()})


def terms(theta: np.ndarray) -> dict[str, np.ndarray]:
    return {PRIOR: -0.5 * theta**2, POLLS: -0.5 * (MEASURED - theta) ** 2 / VARIANCE}


def test_sensitivity_equals_that_of_exactly_rescaled_normal_posteriors(theta):
    found = measure_sensitivity(numbers(theta=theta), terms=terms(theta), rng=np.random.default_rng(2))
    assert found.loc["theta", PRIOR] == pytest.approx(exact_sensitivity("prior_power", theta), rel=0.1)
    assert found.loc["theta", POLLS] == pytest.approx(exact_sensitivity("likelihood_power", theta), rel=0.1)


def test_number_that_nothing_moves_is_left_blank_however_noisy_the_likelihood(theta):
    # A log-likelihood that varies as much as that of a model with hundreds of free numbers.
    busy = 13 * np.random.default_rng(3).normal(size=theta.shape)
    found = measure_sensitivity(numbers(theta=theta), terms={POLLS: busy}, rng=np.random.default_rng(4))
    assert np.isnan(found.loc["theta", POLLS])


def test_sensitivity_survives_the_noise_of_other_dimensions(theta):
    rng = np.random.default_rng(5)
    busy = terms(theta)[PRIOR] + 3 * rng.normal(size=theta.shape)
    found = measure_sensitivity(numbers(theta=theta), terms={PRIOR: busy}, rng=rng)
    assert found.loc["theta", PRIOR] == pytest.approx(exact_sensitivity("prior_power", theta), rel=0.25)


def test_weights_too_uneven_to_rely_on_say_nothing(theta):
    heavy = np.random.default_rng(6).standard_cauchy(theta.shape) * 1e4
    found = measure_sensitivity(numbers(theta=theta), terms={POLLS: heavy}, rng=np.random.default_rng(7))
    assert np.isnan(found.loc["theta", POLLS])


def test_part_that_is_the_same_in_every_draw_says_nothing(theta):
    found = measure_sensitivity(
        numbers(theta=theta), terms={SHARED_LEAN: np.zeros_like(theta)}, rng=np.random.default_rng(8)
    )
    assert np.isnan(found.loc["theta", SHARED_LEAN])


def test_parts_of_the_variance_are_those_the_number_was_made_of():
    rng = np.random.default_rng(9)
    lean, drift, rest = rng.normal(size=(3, 8000))
    number = 2 * lean + drift + rest
    found = explained_part(number, causes=[lean[:, None], drift[:, None]])
    assert found == pytest.approx([4 / 6, 1 / 6], abs=0.02)


def test_cause_that_has_nothing_to_do_with_a_number_explains_nothing():
    rng = np.random.default_rng(10)
    found = explained_part(rng.normal(size=4000), causes=[rng.normal(size=(4000, 20)), np.zeros((4000, 9))])
    assert found == pytest.approx([0, 0], abs=0.005)


def test_log_prior_differs_between_draws_as_the_normal_densities_do():
    layout = Layout(
        names=("drift_log", "drift_own", "shared_lean_ends", "national_modes"),
        starts=(0, 1, 3, 7),
        shapes=((), (2,), (2, 2), (3,)),
    )
    priors = replace(Priors(), drift_log_median=-3.0, drift_log_sd=0.5)
    positions = np.random.default_rng(11).normal(size=(2, 10))
    found = log_prior_terms(positions, layout=layout, priors=priors)
    scales = norm(-3, 0.5).logpdf(positions[:, 0]) + norm.logpdf(positions[:, 1:3]).sum(axis=1)
    assert np.diff(found[PRIOR]) == pytest.approx(np.diff(scales))
    assert np.diff(found[SHARED_LEAN]) == pytest.approx(np.diff(norm.logpdf(positions[:, 3:7]).sum(axis=1)))


def test_variable_without_a_known_prior_is_refused_and_not_passed_over():
    layout = Layout(names=("weather",), starts=(0,), shapes=((),))
    with pytest.raises(KeyError, match="weather"):
        log_prior_terms(np.zeros((2, 1)), layout=layout, priors=Priors())


def test_words_name_the_largest_source_first_and_what_would_move_the_number():
    row = {
        "quantity": "support_on_polling_day",
        "variance_shared_lean": 63.2,
        "variance_drift": 24.6,
        "variance_polls": 12.2,
        "shared_lean": 0.11,
        "prior": float("nan"),
    }
    assert word_sensitivity("Ferry Party on polling day", row) == (
        "How sure the model is of Ferry Party on polling day rests mostly on the assumed error that all "
        "polls share (63 % of the variance; 25 % opinion that may still move, 12 % what polls, regions and "
        "turnout leave open). It would move with the size of that error. The priors of the model's scales "
        "hardly matter to it."
    )
