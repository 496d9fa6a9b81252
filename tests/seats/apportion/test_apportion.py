"""Many rows at once give the seats that fractions give, and say where a tie was broken."""

from __future__ import annotations

from fractions import Fraction

import numba
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.seats.apportion.apportion import apportion, continue_averages
from aggregator.seats.apportion.exact import apportion_exactly
from aggregator.seats.apportion.list_method import ListMethod, highest_averages
from tests.seats.apportion.votes_and_methods import (
    DIVISOR_METHODS,
    METHODS,
    methods,
    seats_in_fractions,
    tickets,
    tie_rules,
    vote_counts,
)


@given(vote_counts(), st.integers(0, 30), methods, tie_rules, st.integers(0, 99))
@settings(max_examples=400, deadline=None)
def test_seats_and_ties_equal_those_in_fractions(
    votes: list[int], seats: int, method: ListMethod, ties: str, seed: int
) -> None:
    lot = tickets(len(votes), seed=seed)
    counted = apportion(np.array([votes], float), seats=seats, method=method, lot=lot[None], ties=ties)
    expected, tied = seats_in_fractions(votes, seats=seats, method=method, lot=lot, ties=ties)
    assert counted.seats[0].tolist() == expected
    assert counted.tied[0] == tied


@pytest.mark.parametrize("method", METHODS)
def test_random_rows_equal_those_in_fractions(method: str) -> None:
    rng = np.random.default_rng(3)
    votes = rng.dirichlet(np.full(7, 0.6), 300)
    votes[rng.random(votes.shape) < 0.1] = 0
    seats = rng.integers(0, 500, 300)
    counted = apportion(votes, seats=seats, method=METHODS[method], lot=rng.random(votes.shape))
    for row in range(300):
        exact = apportion_exactly(
            [Fraction(of_party) for of_party in votes[row].tolist()],
            seats=int(seats[row]),
            method=METHODS[method],
        )
        assert counted.seats[row].tolist() == list(exact.seats)


@given(st.integers(1, 400), st.integers(1, 400), st.sampled_from(list(DIVISOR_METHODS.values())))
@settings(max_examples=200, deadline=None)
def test_one_vote_in_a_thousand_million_million_decides(first: int, second: int, method: ListMethod) -> None:
    # Two parties tie exactly for the last of their seats; then one of them has one vote more.
    unit = 10**10
    ahead, behind = method.divisor(first), method.divisor(second)  # type: ignore[union-attr]
    votes = np.array([[float(ahead * unit), float(behind * unit)]])
    assert votes.max() < 2**53
    seats, lot = first + second - 1, np.array([[0.1, 0.9]])
    level = apportion(votes, seats=seats, method=method, lot=lot)
    assert level.tied[0]
    assert level.seats[0].tolist() == [first - 1, second]
    more = apportion(votes + np.array([1, 0]), seats=seats, method=method, lot=lot)
    assert not more.tied[0]
    assert more.seats[0].tolist() == [first, second - 1]


def test_one_vote_decides_between_remainders() -> None:
    # Hare, 3 seats: 1.5 quotas each; then one vote more.
    votes = np.array([[10.0**15, 10.0**15], [10.0**15 + 2, 10.0**15]])
    counted = apportion(votes, seats=3, method=METHODS["hare"], lot=np.array([[0.1, 0.9]] * 2))
    assert counted.seats.tolist() == [[1, 2], [2, 1]]
    assert counted.tied.tolist() == [True, False]


@pytest.mark.parametrize("method", METHODS)
def test_tied_parties_have_equal_chances(method: str) -> None:
    lot = np.random.default_rng(4).random((4000, 3))
    votes = np.broadcast_to([10.0, 10.0, 10.0], lot.shape)
    counted = apportion(votes, seats=4, method=METHODS[method], lot=lot)
    assert counted.tied.all()
    # Binomial standard error of a third over 4,000 rows is .0075; four of them.
    np.testing.assert_allclose((counted.seats == 2).mean(axis=0), 1 / 3, atol=0.03)


def test_the_party_with_most_votes_wins_a_tie_where_the_law_says_so() -> None:
    # 60 / 3 = 20 / 1: the last of three seats.
    votes, lot = np.array([[60.0, 20.0]]), np.array([[0.1, 0.9]])
    by_lot = apportion(votes, seats=3, method=highest_averages(), lot=lot)
    by_votes = apportion(votes, seats=3, method=highest_averages(), lot=lot, ties="most_votes")
    assert by_lot.seats.tolist() == [[2, 1]]
    assert by_votes.seats.tolist() == [[3, 0]]
    assert by_lot.tied[0] and by_votes.tied[0]


def test_a_first_divisor_close_to_the_second_is_still_exact() -> None:
    # In floats the first divisor is the second, 3, and the first two parties have equal shares: all four of
    # their averages are at the line, for two seats. In fractions both are the second party's, by one vote.
    method = highest_averages("modified_sainte_lague", first_divisor=3 - Fraction(1, 10**20))
    votes = [9 * 10**15, 9 * 10**15 + 1, 151 * 10**14]
    lot = np.array([[0.9, 0.1, 0.1]])
    counted = apportion(np.array([votes], float), seats=5, method=method, lot=lot)
    exact = apportion_exactly(votes, seats=5, method=method)
    assert counted.seats[0].tolist() == list(exact.seats) == [0, 2, 3]
    assert not counted.tied[0]


@pytest.mark.parametrize("scale", [1e-300, 1e-9, 1e200])
@pytest.mark.parametrize("method", METHODS)
def test_the_unit_of_votes_does_not_matter(method: str, scale: float) -> None:
    votes = np.array([[53.0, 24.0, 23.0, 0.0]])
    lot = np.zeros(votes.shape)
    plain = apportion(votes, seats=7, method=METHODS[method], lot=lot)
    scaled = apportion(votes * scale, seats=7, method=METHODS[method], lot=lot)
    np.testing.assert_array_equal(plain.seats, scaled.seats)


@pytest.mark.parametrize("method", METHODS)
def test_the_largest_chamber_fits(method: str) -> None:
    counted = apportion(
        np.array([[7.0, 2.0, 1.0]]), seats=32767, method=METHODS[method], lot=np.zeros((1, 3))
    )
    assert counted.seats.sum() == 32767
    # Where the count starts, before it is mended, one party may stand above the number of seats.
    nearly_alone = np.array([[1.0, *[1e-9] * 10]])
    counted = apportion(nearly_alone, seats=32767, method=METHODS[method], lot=np.zeros((1, 11)))
    assert counted.seats.tolist() == [[32767, *[0] * 10]]


def test_votes_in_single_precision_and_views_of_tickets_will_do() -> None:
    votes = np.array([[0.6, 0.28, 0.12]] * 5, dtype=np.float32)
    lot = np.broadcast_to(np.float32([0.1, 0.2, 0.3]), votes.shape)
    counted = apportion(votes, seats=5, method=highest_averages(), lot=lot)  # type: ignore[arg-type]
    assert counted.seats.tolist() == [[4, 1, 0]] * 5


@pytest.mark.parametrize("method", METHODS)
def test_number_of_threads_changes_nothing(method: str) -> None:
    rng = np.random.default_rng(6)
    votes = rng.integers(0, 30, (3000, 5)) + np.array([1.0, 0, 0, 0, 0])
    question = {"seats": rng.integers(0, 12, 3000), "method": METHODS[method], "lot": rng.random(votes.shape)}
    several = apportion(votes, **question)
    before = numba.get_num_threads()
    try:
        numba.set_num_threads(1)
        one = apportion(votes, **question)
    finally:
        numba.set_num_threads(before)
    np.testing.assert_array_equal(one.seats, several.seats)
    np.testing.assert_array_equal(one.tied, several.tied)
    assert one.tied.any()


def test_inputs_are_left_as_they_were() -> None:
    votes, start = np.array([[5.0, 3.0]]), np.array([[1, 0]], dtype=np.int16)
    continue_averages(votes, start=start, seats=4, method=highest_averages(), lot=np.zeros((1, 2)))
    assert votes.tolist() == [[5, 3]]
    assert start.tolist() == [[1, 0]]


def test_no_rows_give_no_seats() -> None:
    counted = apportion(np.zeros((0, 3)), seats=4, method=highest_averages(), lot=np.zeros((0, 3)))
    assert counted.seats.shape == (0, 3)


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("bad", [[0.0, 0.0], [np.nan, 1.0], [np.inf, 1.0], [-1.0, 2.0]])
def test_rows_without_usable_votes_are_named(method: str, bad: list[float]) -> None:
    votes = np.array([[1.0, 2.0], bad, bad])
    with pytest.raises(ValueError, match=r"votes: 2 rows, the first at position 1, have seats to fill"):
        apportion(votes, seats=3, method=METHODS[method], lot=np.zeros(votes.shape))


@pytest.mark.parametrize("method", METHODS)
def test_a_row_without_seats_needs_no_votes(method: str) -> None:
    counted = apportion(np.zeros((1, 2)), seats=0, method=METHODS[method], lot=np.zeros((1, 2)))
    assert counted.seats.tolist() == [[0, 0]]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"ties": "age"}, "ties: got 'age'; expected one of lot, most_votes"),
        ({"lot": np.zeros((1, 3))}, r"lot: got shape \(1, 3\); expected that of the votes, \(1, 2\)"),
        ({"seats": -1}, "seats: got -1 to -1; expected 0 to 32767"),
        ({"seats": 40_000}, "seats: got 40000 to 40000; expected 0 to 32767"),
    ],
)
def test_questions_without_an_answer_are_refused(change: dict[str, object], message: str) -> None:
    question = {"seats": 3, "method": highest_averages(), "lot": np.zeros((1, 2)), **change}
    with pytest.raises(ValueError, match=message):
        apportion(np.ones((1, 2)), **question)  # type: ignore[arg-type]


def test_more_seats_held_than_there_are_is_refused() -> None:
    with pytest.raises(ValueError, match="start: 1 rows, the first at position 0, hold more seats"):
        continue_averages(
            np.ones((1, 2)),
            start=np.array([[3, 1]]),
            seats=3,
            method=highest_averages(),
            lot=np.zeros((1, 2)),
        )
