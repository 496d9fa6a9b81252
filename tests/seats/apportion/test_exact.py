"""The readable methods: ties reported and not broken, and bad questions refused."""

from __future__ import annotations

import doctest
from fractions import Fraction

import pytest

from aggregator.seats.apportion import exact, list_method
from aggregator.seats.apportion.exact import ExactApportionment, apportion_exactly, in_order_of_claim
from aggregator.seats.apportion.list_method import highest_averages, largest_remainder


@pytest.mark.parametrize("module", [exact, list_method])
def test_examples_in_the_docstrings_hold(module: object) -> None:
    outcome = doctest.testmod(module)  # type: ignore[arg-type]
    assert outcome.attempted
    assert not outcome.failed


def test_a_tie_that_costs_nobody_a_seat_is_none() -> None:
    assert apportion_exactly([5, 5], seats=2, method=highest_averages()).contested == 0


def test_of_three_equal_parties_two_seats_are_contested() -> None:
    found = apportion_exactly([4, 4, 4, 9], seats=4, method=highest_averages())
    assert found == ExactApportionment(seats=(0, 0, 0, 2), tied=(0, 1, 2), contested=2)


def test_whole_droop_quotas_fill_one_seat_too_many_and_one_party_loses_its_last() -> None:
    # 60, 40 and 20 votes, 5 seats: the quota is 120 / 6 = 20, met 3 + 2 + 1 = 6 times.
    found = apportion_exactly([60, 40, 20], seats=5, method=largest_remainder("droop"))
    assert found == ExactApportionment(seats=(2, 1, 0), tied=(0, 1, 2), contested=2)


def test_a_party_just_short_of_whole_droop_quotas_is_the_one_that_loses() -> None:
    found = apportion_exactly([6000, 4000, 1999], seats=5, method=largest_remainder("droop"))
    assert found == ExactApportionment(seats=(3, 2, 0), tied=(), contested=0)


def test_votes_may_be_fractions() -> None:
    votes = [Fraction(1, 3), Fraction(2, 3)]
    assert apportion_exactly(votes, seats=3, method=largest_remainder()).seats == (1, 2)


def test_highest_averages_go_on_from_seats_held() -> None:
    # Without a start 4-1-0 (Gallagher 1991, table 1); the seat held by the last party comes off the first.
    found = apportion_exactly([60, 28, 12], seats=5, method=highest_averages(), start=[0, 0, 1])
    assert found.seats == (3, 1, 1)


def test_order_of_claim_follows_the_stated_rule() -> None:
    question = {"votes": [5.0, 9.0, 5.0], "lot": [0.1, 0.2, 0.9]}
    assert in_order_of_claim([0, 1, 2], **question, ties="lot") == [2, 1, 0]
    assert in_order_of_claim([0, 1, 2], **question, ties="most_votes") == [1, 2, 0]


@pytest.mark.parametrize(
    ("votes", "arguments", "message"),
    [
        ([1, -1], {}, "votes: a party has fewer than none"),
        ([0, 0], {}, "votes: no party has any, so nobody can have the seats"),
        ([1, 1], {"start": [2, 2]}, "start: 4 seats are held already; there are 3 in all"),
    ],
)
def test_questions_without_an_answer_are_refused(
    votes: list[int], arguments: dict[str, list[int]], message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        apportion_exactly(votes, seats=3, method=highest_averages(), **arguments)


def test_largest_remainder_starts_from_nothing() -> None:
    with pytest.raises(ValueError, match="only highest averages can go on"):
        apportion_exactly([1, 1], seats=3, method=largest_remainder(), start=[1, 0])


def test_unknown_names_of_methods_are_refused_with_the_known_ones() -> None:
    with pytest.raises(ValueError, match="divisors: got 'danish'; expected one of dhondt, sainte_lague"):
        highest_averages("danish")
    with pytest.raises(ValueError, match="quota: got 'imperiali'; expected one of hare, droop"):
        largest_remainder("imperiali")


@pytest.mark.parametrize("first", [Fraction(0), Fraction(3)])
def test_a_first_divisor_stays_below_the_second(first: Fraction) -> None:
    with pytest.raises(ValueError, match="expected a number above 0 and below the second divisor, 3"):
        highest_averages("modified_sainte_lague", first_divisor=first)
