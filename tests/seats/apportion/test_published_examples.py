"""Worked examples of the literature; 'from memory' beside those that were not looked up."""

from __future__ import annotations

import numpy as np
import pytest

from aggregator.seats.apportion.apportion import apportion
from aggregator.seats.apportion.exact import ExactApportionment, apportion_exactly
from tests.seats.apportion.votes_and_methods import METHODS

EXAMPLES = [
    # Gallagher 1991, Electoral Studies 10:33–51, table 1: D'Hondt as printed there, the others computed by
    # hand from its votes.
    ([60_000, 28_000, 12_000], 5, {
        "dhondt": [4, 1, 0], "sainte_lague": [3, 1, 1], "modified_sainte_lague": [3, 2, 0], "hare": [3, 1, 1],
    }),
    # Balinski and Young, Fair Representation: votes from memory, seats computed by hand.
    ([9061, 7179, 5259, 3319, 1182], 26, {
        "dhondt": [10, 7, 5, 3, 1], "sainte_lague": [9, 8, 5, 3, 1], "hare": [9, 7, 5, 4, 1],
    }),
    # Votes that many textbooks use (common practice), seats computed by hand.
    ([340_000, 280_000, 160_000, 60_000], 7, {
        "dhondt": [3, 3, 1, 0], "sainte_lague": [3, 2, 1, 1], "modified_sainte_lague": [3, 3, 1, 0],
        "hare": [3, 2, 1, 1],
    }),
    # As before; the modified method ties here, see below.
    ([100_000, 80_000, 30_000, 20_000], 8, {
        "dhondt": [4, 3, 1, 0], "sainte_lague": [3, 3, 1, 1], "hare": [3, 3, 1, 1],
    }),
    # From memory.
    ([53_000, 24_000, 23_000], 7, {
        "dhondt": [4, 2, 1], "sainte_lague": [3, 2, 2], "modified_sainte_lague": [3, 2, 2], "hare": [4, 2, 1],
    }),
]  # fmt: skip
CASES = [
    pytest.param(votes, seats, method, expected, id=f"{votes[0]}-{seats}-{method}")
    for votes, seats, by_method in EXAMPLES
    for method, expected in by_method.items()
]


@pytest.mark.parametrize(("votes", "seats", "method", "expected"), CASES)
def test_published_seats_come_out_in_fractions_and_in_floats(
    votes: list[int], seats: int, method: str, expected: list[int]
) -> None:
    exact = apportion_exactly(votes, seats=seats, method=METHODS[method])
    assert exact == ExactApportionment(seats=tuple(expected), tied=(), contested=0)
    # As votes, and as shares.
    rows = np.array([votes, np.array(votes) / sum(votes)])
    counted = apportion(rows, seats=seats, method=METHODS[method], lot=np.zeros(rows.shape))
    assert counted.seats.tolist() == [expected, expected]
    assert not counted.tied.any()


@pytest.mark.parametrize(
    ("tickets", "expected"), [([0.9, 0, 0, 0.1], [4, 3, 1, 0]), ([0.1, 0, 0, 0.9], [3, 3, 1, 1])]
)
def test_the_exact_tie_of_the_modified_method_is_seen_and_goes_by_lot(
    tickets: list[float], expected: list[int]
) -> None:
    # 100000 / 7 = 20000 / 1.4, which floating point need not see.
    votes = np.array([[100_000.0, 80_000, 30_000, 20_000]])
    counted = apportion(votes, seats=8, method=METHODS["modified_sainte_lague"], lot=np.array([tickets]))
    assert counted.seats.tolist() == [expected]
    assert counted.tied.tolist() == [True]


def test_a_larger_house_can_cost_a_party_a_seat_by_largest_remainder() -> None:
    # The Alabama paradox in small numbers (common practice): 10 and 11 seats for 6, 6 and 2 votes.
    votes = np.array([[6.0, 6, 2], [6, 6, 2]])
    counted = apportion(votes, seats=np.array([10, 11]), method=METHODS["hare"], lot=np.zeros((2, 3)))
    assert counted.seats.tolist() == [[4, 4, 2], [5, 5, 1]]
    assert not counted.tied.any()


def test_dhondt_can_exceed_the_upper_quota() -> None:
    # 51 of 100 votes are worth 10.2 of 20 seats; the other 49 votes are split (common practice).
    votes = np.array([[51.0, *[7] * 7]])
    counted = apportion(votes, seats=20, method=METHODS["dhondt"], lot=np.zeros((1, 8)))
    assert counted.seats.tolist() == [[13, *[1] * 7]]


@pytest.mark.parametrize("method", METHODS)
def test_two_equal_parties_and_one_seat_are_a_tie_by_every_method(method: str) -> None:
    exact = apportion_exactly([1, 1], seats=1, method=METHODS[method])
    assert exact == ExactApportionment(seats=(0, 0), tied=(0, 1), contested=1)
    lot = np.array([[0.2, 0.8], [0.8, 0.2]])
    counted = apportion(np.ones((2, 2)), seats=1, method=METHODS[method], lot=lot)
    assert counted.seats.tolist() == [[0, 1], [1, 0]]
    assert counted.tied.all()
