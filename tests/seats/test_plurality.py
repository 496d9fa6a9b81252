"""The compiled count equals a plain one, and favours nobody."""

from __future__ import annotations

import numba
import numpy as np
import pytest

from aggregator.seats.plurality import count_firsts
from aggregator.seats.recentring import solve_multipliers
from aggregator.seats.rules import SeatVotes
from tests.seats.reference_count import reference_count, reference_votes
from tests.seats.test_recentring import random_chamber


def seat_votes(seed: int, **shape: int) -> SeatVotes:
    chamber = random_chamber(seed, **shape)
    lot = np.random.default_rng(seed).random(
        (chamber["strength"].shape[0], chamber["weight"].size), dtype=np.float32
    )
    return SeatVotes(
        strength=chamber["strength"],
        multiplier=solve_multipliers(**chamber).multiplier,
        region_start=chamber["region_start"],
        lot=lot,
    )


def tied_votes(*, draws: int, seats: int, parties: int = 3) -> SeatVotes:
    """The last party trails; all others have exactly the same votes in every seat."""
    strength = np.ones((draws, parties, seats), dtype=np.float32)
    strength[:, -1] = 0.5
    return SeatVotes(
        strength=strength,
        multiplier=np.ones((draws, 2, 1, parties), dtype=np.float32),
        region_start=np.array([0, seats]),
        lot=np.random.default_rng(8).random((draws, seats), dtype=np.float32),
    )


@pytest.mark.parametrize("seed", range(8))
def test_seats_equal_those_of_a_plain_numpy_count(seed: int) -> None:
    votes = seat_votes(seed, draws=20)
    expected = reference_count(reference_votes(votes.strength, votes.multiplier, votes.region_start))
    np.testing.assert_array_equal(count_firsts(votes).seats, expected)


def test_winners_of_seats_add_up_to_the_counted_seats() -> None:
    counted = count_firsts(seat_votes(2, draws=50))
    np.testing.assert_array_equal(counted.won.sum(axis=1), counted.seats[:, -1])
    assert (counted.won.sum(axis=2) == 1).all()


def test_an_exact_tie_is_decided_by_lot_with_equal_chances() -> None:
    counted = count_firsts(tied_votes(draws=2000, seats=5))
    assert (counted.seats.sum(axis=-1) == 5).all()
    # Binomial standard error of a half over 2,000 draws is .011; four of them.
    chance = counted.won.mean(axis=0)
    np.testing.assert_allclose(chance[:, :2], 0.5, atol=0.045)
    assert (chance[:, 2] == 0).all()
    # Every seat on each of the two dates was decided by lot, and is said to be.
    assert (counted.ties == 2 * 5).all()
    np.testing.assert_array_equal(counted.seats[:, 0], counted.seats[:, 1])


def test_ties_of_different_seats_are_decided_apart() -> None:
    seats = count_firsts(tied_votes(draws=4000, seats=4)).seats[:, -1, 0]
    # Four fair lots: variance 1; one lot for all four would give 4.
    assert abs(seats.var() - 1) < 0.15


def test_number_of_threads_changes_nothing() -> None:
    votes = seat_votes(4, draws=40)
    before = numba.get_num_threads()
    several = count_firsts(votes)
    try:
        numba.set_num_threads(1)
        one = count_firsts(votes)
        chamber = random_chamber(4, draws=40)
        alone = solve_multipliers(**chamber).multiplier
    finally:
        numba.set_num_threads(before)
    np.testing.assert_array_equal(one.seats, several.seats)
    np.testing.assert_array_equal(one.won, several.won)
    np.testing.assert_array_equal(alone, votes.multiplier)
