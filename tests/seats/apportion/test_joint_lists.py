"""Parties that run as one list win seats as one, and share them by the same method."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.seats.apportion.apportion import apportion
from aggregator.seats.apportion.compensation import OVERHANG_RULES, compensate
from aggregator.seats.apportion.joint_lists import apportion_lists, compensate_lists
from aggregator.seats.apportion.list_method import ListMethod, highest_averages
from tests.seats.apportion.votes_and_methods import METHODS, methods, tickets, vote_counts


def test_a_joint_list_wins_a_seat_its_members_would_not_win_apart() -> None:
    # By hand, D'Hondt, 5 seats. Apart the fifth average is 45 / 3 = 15, ahead of 40 / 3 and 12. Together the
    # first and third have 52 / 3 = 17.3; the larger of them gets the seat, 40 / 3 being ahead of 12.
    votes, lot = np.array([[40.0, 45, 12]]), np.zeros((1, 3))
    apart = apportion(votes, seats=5, method=highest_averages(), lot=lot)
    joint = apportion_lists(votes, seats=5, method=highest_averages(), lists=[[0, 2]], lot=lot)
    assert apart.seats.tolist() == [[2, 3, 0]]
    assert joint.seats.tolist() == [[3, 2, 0]]
    assert not joint.tied[0]


def test_a_tie_among_members_is_marked() -> None:
    # 30, 20 and 15 are the averages of the three seats: no tie among lists, but one within the joint list.
    votes, lot = np.array([[10.0, 10.0, 30.0]]), np.array([[0.2, 0.8, 0.5]])
    counted = apportion_lists(votes, seats=3, method=highest_averages(), lists=[[0, 1]], lot=lot)
    assert counted.seats.tolist() == [[0, 1, 2]]
    assert counted.tied[0]


def test_a_joint_lists_ticket_is_as_good_as_any() -> None:
    lot = np.random.default_rng(5).random((4000, 3))
    votes = np.broadcast_to([3.0, 7.0, 10.0], lot.shape)
    counted = apportion_lists(votes, seats=1, method=highest_averages(), lists=[[0, 1]], lot=lot)
    assert counted.tied.all()
    # Binomial standard error of a half over 4,000 rows is .008; four of them.
    np.testing.assert_allclose(counted.seats.mean(axis=0), [0, 0.5, 0.5], atol=0.032)


@given(vote_counts(), st.integers(0, 20), methods, st.integers(0, 99), st.data())
@settings(max_examples=100, deadline=None)
def test_a_joint_list_has_the_seats_of_one_party_with_its_votes(
    votes: list[int], seats: int, method: ListMethod, seed: int, data: st.DataObject
) -> None:
    votes = [*votes, 5]
    members = data.draw(st.sets(st.integers(0, len(votes) - 1), min_size=2))
    lot = tickets(len(votes), seed=seed)[None]
    joint = apportion_lists(
        np.array([votes], float), seats=seats, method=method, lists=[list(members)], lot=lot
    )
    others = [party for party in range(len(votes)) if party not in members]
    merged = np.array([[sum(votes[party] for party in members), *(votes[party] for party in others)]], float)
    merged_lot = np.concatenate(
        [lot[:, list(members)].sum(axis=1, keepdims=True) % 1, lot[:, others]], axis=1
    )
    one = apportion(merged, seats=seats, method=method, lot=merged_lot)
    assert joint.seats[0, list(members)].sum() == one.seats[0, 0]
    np.testing.assert_array_equal(joint.seats[0, others], one.seats[0, 1:])


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("overhang", OVERHANG_RULES)
def test_without_joint_lists_all_stays_as_it_was(method: str, overhang: str) -> None:
    rng = np.random.default_rng(7)
    votes, lot = rng.dirichlet(np.full(4, 2.0), 50), rng.random((50, 4))
    local = rng.multinomial(10, [0.7, 0.1, 0.1, 0.1], 50)
    question = {"seats": 20, "method": METHODS[method], "lot": lot}
    np.testing.assert_array_equal(
        apportion_lists(votes, lists=[], **question).seats, apportion(votes, **question).seats
    )
    np.testing.assert_array_equal(
        compensate_lists(votes, local=local, lists=[[2]], overhang=overhang, **question).seats,
        compensate(votes, local=local, overhang=overhang, **question).seats,
    )


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("overhang", OVERHANG_RULES)
def test_members_of_a_joint_list_keep_their_local_seats(method: str, overhang: str) -> None:
    rng = np.random.default_rng(8)
    votes, lot = rng.dirichlet(np.full(5, 2.0), 200), rng.random((200, 5))
    votes[:50, 1] = 0
    local = rng.multinomial(10, [0.5, 0.3, 0.1, 0.05, 0.05], 200)
    together = compensate_lists(
        votes, local=local, seats=20, method=METHODS[method], lists=[[0, 1]], overhang=overhang, lot=lot
    )
    assert (together.seats >= local).all()
    lot_of_list = lot[:, :2].sum(axis=1) % 1
    merged = compensate(
        np.column_stack([votes[:, :2].sum(axis=1), votes[:, 2:]]),
        local=np.column_stack([local[:, :2].sum(axis=1), local[:, 2:]]),
        seats=20,
        method=METHODS[method],
        overhang=overhang,
        lot=np.column_stack([lot_of_list, lot[:, 2:]]),
    )
    np.testing.assert_array_equal(together.seats[:, :2].sum(axis=1), merged.seats[:, 0])
    np.testing.assert_array_equal(together.seats[:, 2:], merged.seats[:, 1:])
