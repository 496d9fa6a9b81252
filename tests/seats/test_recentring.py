"""A region's seats meet its support, and every share adds up."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.seats.recentring import TOLERANCE, solve_multipliers
from tests.seats.reference_count import reference_multipliers, reference_votes

# Sums of single-precision numbers are good to about this in share units.
SINGLE_PRECISION = 1e-5


def random_chamber(seed: int, *, draws: int = 3, dates: int = 4, parties: int = 4) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(seed)
    seats_of_region = rng.integers(1, 12, rng.integers(1, 4))
    region_start = np.append(0, np.cumsum(seats_of_region))
    weight = rng.uniform(0.5, 2, region_start[-1])
    weight /= np.repeat(np.add.reduceat(weight, region_start[:-1]), seats_of_region)
    strength = np.exp(rng.normal(0, 0.8, (draws, parties, weight.size))).astype(np.float32)
    support = rng.dirichlet(np.full(parties, 5.0), (draws, dates, seats_of_region.size)).astype(np.float32)
    return {"strength": strength, "support": support, "weight": weight, "region_start": region_start}


@settings(max_examples=30, deadline=None)
@given(seed=st.integers(0, 10_000))
def test_turnout_weighted_mean_of_a_regions_seats_is_its_support(seed: int) -> None:
    chamber = random_chamber(seed)
    solved = solve_multipliers(**chamber)
    votes = reference_votes(chamber["strength"], solved.multiplier, chamber["region_start"])
    mean = np.add.reduceat(votes * chamber["weight"], chamber["region_start"][:-1], axis=-1)
    gap = np.abs(mean.transpose(0, 1, 3, 2) - chamber["support"]).max()
    assert solved.largest_gap <= TOLERANCE
    assert gap <= TOLERANCE + SINGLE_PRECISION


def test_shares_equal_those_of_a_double_precision_reference() -> None:
    chamber = random_chamber(11)
    solved = solve_multipliers(**chamber)
    start = chamber["region_start"]
    ours = reference_votes(chamber["strength"], solved.multiplier, start)
    theirs = reference_votes(chamber["strength"], reference_multipliers(**chamber), start)
    np.testing.assert_allclose(ours, theirs, atol=3e-4)


def test_party_that_stands_nowhere_in_a_region_gets_no_share() -> None:
    chamber = random_chamber(3)
    chamber["strength"][:, 2] = 0
    chamber["support"][..., 2] = 0
    chamber["support"] /= chamber["support"].sum(axis=-1, keepdims=True)
    solved = solve_multipliers(**chamber)
    assert solved.largest_gap <= TOLERANCE
    assert (solved.multiplier[..., 2] == 0).all()


def test_party_recovers_after_a_date_without_any_support() -> None:
    chamber = random_chamber(5, dates=3)
    chamber["support"][:, 1, :, 0] = 0
    chamber["support"] /= chamber["support"].sum(axis=-1, keepdims=True)
    solved = solve_multipliers(**chamber)
    assert solved.largest_gap <= TOLERANCE


def test_a_gap_that_could_not_be_closed_is_reported() -> None:
    chamber = random_chamber(7)
    assert solve_multipliers(**chamber, max_steps=1).largest_gap > TOLERANCE
