"""Seats equal those of the registry library ``apportionment`` (Martin Lackner), on thousands of random votes.

The library breaks ties by the order of parties, or raises where told not to. So seats are compared where
neither sees a tie, and it must see ties where we do. Its fractions are exact for all methods here but the
modified Sainte-Laguë, which it counts in floats: ties of that one are not compared.
"""

from __future__ import annotations

import apportionment.methods as library
import numpy as np
import pytest

from aggregator.seats.apportion.apportion import apportion
from aggregator.seats.apportion.list_method import ListMethod, highest_averages, largest_remainder

METHODS: dict[str, ListMethod] = {
    "dhondt": highest_averages("dhondt"),
    "saintelague": highest_averages("sainte_lague"),
    "modified_saintelague": highest_averages("modified_sainte_lague"),
    "largest_remainder": largest_remainder("hare"),
}
EXACT_THERE = ["dhondt", "saintelague", "largest_remainder"]
ROWS = 2000


def seats_of_library(method: str, votes: np.ndarray, seats: int) -> list[int] | None:
    """Seats, or None where the library sees a tie."""
    try:
        return library.compute(
            method, votes.tolist(), seats, fractions=method in EXACT_THERE, tiesallowed=False
        )
    except library.TiesException:
        return None


@pytest.mark.parametrize("method", METHODS)
def test_seats_equal_on_random_votes(method: str) -> None:
    rng = np.random.default_rng(11)
    parties = 6
    votes = rng.integers(0, 10**6, (ROWS, parties)) * (rng.random((ROWS, parties)) < 0.9)
    votes[:, 0] += 1
    seats = rng.integers(1, 25, ROWS)
    counted = apportion(votes.astype(float), seats=seats, method=METHODS[method], lot=rng.random(votes.shape))
    compared = 0
    for row in range(ROWS):
        expected = seats_of_library(method, votes[row], int(seats[row]))
        if expected is not None and not counted.tied[row]:
            compared += 1
            assert counted.seats[row].tolist() == expected
    assert compared > 0.99 * ROWS


@pytest.mark.parametrize("method", EXACT_THERE)
def test_ties_are_seen_where_the_library_sees_them(method: str) -> None:
    rng = np.random.default_rng(12)
    votes = rng.integers(0, 12, (ROWS, 4))
    votes[:, 0] += 1
    seats = rng.integers(1, 10, ROWS)
    counted = apportion(votes.astype(float), seats=seats, method=METHODS[method], lot=rng.random(votes.shape))
    for row in range(ROWS):
        expected = seats_of_library(method, votes[row], int(seats[row]))
        assert counted.tied[row] == (expected is None)
        if expected is not None:
            assert counted.seats[row].tolist() == expected
    assert 0.1 < counted.tied.mean() < 0.9
