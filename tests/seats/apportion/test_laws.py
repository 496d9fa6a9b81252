"""What is proved of the methods, on votes with many ties.

Proofs: Balinski and Young, Fair Representation; Pukelsheim, Proportional Representation, 2nd ed. 2017. Each
test says for which methods its law is a theorem.
"""

from __future__ import annotations

from itertools import pairwise
from math import ceil, floor
from random import Random

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from aggregator.seats.apportion.apportion import apportion
from aggregator.seats.apportion.list_method import ListMethod, highest_averages, largest_remainder
from tests.seats.apportion.votes_and_methods import (
    divisor_methods,
    methods,
    quota_methods,
    tickets,
    tie_rules,
    vote_counts,
)

laws = settings(max_examples=150, deadline=None)
houses = st.integers(0, 25)
seeds = st.integers(0, 99)


def count(votes: list[int], seats: int, method: ListMethod, *, seed: int, ties: str = "lot") -> list[int]:
    lot = tickets(len(votes), seed=seed)[None]
    return (
        apportion(np.array([votes], float), seats=seats, method=method, lot=lot, ties=ties).seats[0].tolist()
    )


@given(vote_counts(), houses, methods, tie_rules, seeds)
@laws
def test_seats_sum_to_those_asked_for_and_an_absent_party_has_none(
    votes: list[int], seats: int, method: ListMethod, ties: str, seed: int
) -> None:
    filled = count(votes, seats, method, seed=seed, ties=ties)
    assert sum(filled) == seats
    assert all(number == 0 for number, of_party in zip(filled, votes, strict=True) if of_party == 0)


@given(vote_counts(), houses, divisor_methods, tie_rules, seeds)
@laws
def test_one_seat_more_costs_nobody_one_by_highest_averages(
    votes: list[int], seats: int, method: ListMethod, ties: str, seed: int
) -> None:
    # A theorem for divisor methods only; the Alabama paradox is the counterexample for largest remainder.
    fewer = count(votes, seats, method, seed=seed, ties=ties)
    more = count(votes, seats + 1, method, seed=seed, ties=ties)
    assert all(after >= before for before, after in zip(fewer, more, strict=True))


@given(vote_counts(), houses, seeds)
@laws
def test_largest_remainder_by_hare_stays_within_the_quota(votes: list[int], seats: int, seed: int) -> None:
    # A theorem for the Hare quota only.
    for number, of_party in zip(count(votes, seats, largest_remainder(), seed=seed), votes, strict=True):
        quotas = of_party * seats / sum(votes)
        assert floor(quotas) <= number <= ceil(quotas)


@given(vote_counts(), houses, seeds)
@laws
def test_dhondt_and_droop_stay_at_or_above_the_lower_quota(votes: list[int], seats: int, seed: int) -> None:
    # A theorem for both; of the divisor methods D'Hondt is the only one (Balinski and Young).
    for method in (highest_averages("dhondt"), largest_remainder("droop")):
        for number, of_party in zip(count(votes, seats, method, seed=seed), votes, strict=True):
            assert number >= of_party * seats // sum(votes)


@given(vote_counts(), houses, methods, tie_rules, seeds, st.data())
@laws
def test_more_votes_with_all_others_fixed_never_cost_a_seat(
    votes: list[int], seats: int, method: ListMethod, ties: str, seed: int, data: st.DataObject
) -> None:
    # A theorem for all methods here. Divisor methods: only this party's averages rise. Largest remainder: a
    # party is rounded up where its remainder passes a cut. Its own number of quotas rises, all others' fall;
    # it could lose a seat only by a higher cut, and then nobody would win one, so the sum would fall short.
    party = data.draw(st.integers(0, len(votes) - 1))
    richer = [*votes]
    richer[party] += data.draw(st.integers(1, 30))
    before = count(votes, seats, method, seed=seed, ties=ties)
    after = count(richer, seats, method, seed=seed, ties=ties)
    assert after[party] >= before[party]


@given(vote_counts(), vote_counts(), houses, divisor_methods, seeds)
@laws
def test_a_party_that_grows_never_loses_a_seat_to_one_that_shrinks_by_highest_averages(
    before: list[int], after: list[int], seats: int, method: ListMethod, seed: int
) -> None:
    # A theorem for divisor methods only (Balinski and Young): largest remainder has the population paradox.
    parties = min(len(before), len(after))
    before, after = before[:parties], after[:parties]
    assume(any(before) and any(after))
    first, second = count(before, seats, method, seed=seed), count(after, seats, method, seed=seed)
    grown = [party for party in range(parties) if after[party] > before[party]]
    shrunk = [party for party in range(parties) if after[party] < before[party]]
    for winner in grown:
        for loser in shrunk:
            assert second[winner] >= first[winner] or second[loser] <= first[loser]


@given(vote_counts(), houses, methods, tie_rules, seeds, st.integers(2, 10**6))
@laws
def test_scaling_all_votes_changes_nothing(
    votes: list[int], seats: int, method: ListMethod, ties: str, seed: int, factor: int
) -> None:
    scaled = [of_party * factor for of_party in votes]
    assert count(scaled, seats, method, seed=seed, ties=ties) == count(
        votes, seats, method, seed=seed, ties=ties
    )


@given(vote_counts(), houses, methods, tie_rules, seeds, st.randoms(use_true_random=False))
@laws
def test_relabelling_parties_relabels_their_seats(
    votes: list[int], seats: int, method: ListMethod, ties: str, seed: int, random: Random
) -> None:
    order = list(range(len(votes)))
    random.shuffle(order)
    lot = tickets(len(votes), seed=seed)[None]
    row = np.array([votes], float)
    plain = apportion(row, seats=seats, method=method, lot=lot, ties=ties)
    moved = apportion(row[:, order], seats=seats, method=method, lot=lot[:, order], ties=ties)
    np.testing.assert_array_equal(moved.seats, plain.seats[:, order])
    assert moved.tied == plain.tied


@given(vote_counts(), houses, methods, seeds)
@laws
def test_a_party_with_more_votes_never_has_fewer_seats(
    votes: list[int], seats: int, method: ListMethod, seed: int
) -> None:
    # A theorem for all methods here.
    filled = count(votes, seats, method, seed=seed)
    ranked = sorted(zip(votes, filled, strict=True))
    assert all(poorer[1] <= richer[1] for poorer, richer in pairwise(ranked) if poorer[0] < richer[0])


@given(vote_counts(parties=4), vote_counts(parties=4), houses, quota_methods, seeds)
@laws
def test_rows_do_not_touch_each_other(
    first: list[int], second: list[int], seats: int, method: ListMethod, seed: int
) -> None:
    width = max(len(first), len(second))
    votes = np.array([row + [0] * (width - len(row)) for row in (first, second)], float)
    lot = np.stack([tickets(width, seed=seed)] * 2)
    together = apportion(votes, seats=seats, method=method, lot=lot)
    for row in (0, 1):
        alone = apportion(votes[[row]], seats=seats, method=method, lot=lot[[row]])
        np.testing.assert_array_equal(alone.seats[0], together.seats[row])
