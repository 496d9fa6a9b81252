"""Mixed chambers: what becomes of a party with more local seats than its part, by each of three rules."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.seats.apportion.apportion import apportion
from aggregator.seats.apportion.compensation import GROWTH_LIMIT, OVERHANG_RULES, Compensated, compensate
from aggregator.seats.apportion.list_method import ListMethod, highest_averages, largest_remainder
from tests.seats.apportion.votes_and_methods import (
    METHODS,
    divisor_methods,
    methods,
    seats_in_fractions,
    tickets,
    tie_rules,
)

# By hand: list votes 50, 30, 20; 10 seats; D'Hondt gives 5-3-2, the last seats at an average of 10. The first
# party has won 7 local seats. Its seventh comes at 50 / 7 = 7.14, after 30 / 4 = 7.5 and its own sixth.
VOTES, LOCAL, SEATS = [50.0, 30.0, 20.0], [7, 1, 0], 10


def by_hand(overhang: str, **change: object) -> Compensated:
    question = {"votes": VOTES, "local": LOCAL, "seats": SEATS, "method": highest_averages(), **change}
    votes, local = np.array([question.pop("votes")]), np.array([question.pop("local")])
    return compensate(
        votes,
        local=local,
        overhang=overhang,
        lot=np.arange(votes.size)[None] / votes.size,
        **question,  # type: ignore[arg-type]
    )


@pytest.mark.parametrize(
    ("overhang", "expected"), [("kept", [7, 3, 2]), ("levelled", [7, 4, 2]), ("within", [7, 2, 1])]
)
def test_three_rules_for_one_overhang_by_dhondt(overhang: str, expected: list[int]) -> None:
    found = by_hand(overhang)
    assert found.seats.tolist() == [expected]
    assert not found.tied[0]
    assert not found.stopped[0]


@pytest.mark.parametrize(
    ("overhang", "expected"), [("kept", [7, 3, 2]), ("levelled", [7, 4, 3]), ("within", [7, 2, 1])]
)
@pytest.mark.parametrize("method", [highest_averages("sainte_lague"), largest_remainder("hare")])
def test_three_rules_for_one_overhang_by_sainte_lague_and_hare(
    method: ListMethod, overhang: str, expected: list[int]
) -> None:
    # By hand. Sainte-Laguë: the seventh seat comes at 50 / 13 = 3.85, when the others have 4 and 3. Hare: 13
    # seats are 6.5, 3.9 and 2.6 quotas, which leaves the first at 6; 14 are 7, 4.2 and 2.8. Three seats for
    # 30 and 20 votes: 30, 20, 10 by Sainte-Laguë, 1.8 and 1.2 quotas by Hare.
    assert by_hand(overhang, method=method).seats.tolist() == [expected]


@pytest.mark.parametrize("overhang", OVERHANG_RULES)
def test_without_overhang_the_chamber_is_in_proportion(overhang: str) -> None:
    assert by_hand(overhang, local=[5, 0, 1]).seats.tolist() == [[5, 3, 2]]


@pytest.mark.parametrize(
    ("overhang", "expected"), [("kept", [7, 3, 2, 2]), ("levelled", [7, 4, 2, 2]), ("within", [7, 2, 1, 2])]
)
def test_local_seats_without_list_votes_stay_outside_the_proportion(
    overhang: str, expected: list[int]
) -> None:
    found = by_hand(overhang, votes=[*VOTES, 0.0], local=[*LOCAL, 2], seats=SEATS + 2)
    assert found.seats.tolist() == [expected]


def test_a_levelled_chamber_grows_past_a_lost_lot() -> None:
    # One seat, two equal parties: the lot gives it to the second, but the first has won it locally.
    found = by_hand("levelled", votes=[5.0, 5.0], local=[1, 0], seats=1)
    assert found.seats.tolist() == [[1, 1]]
    assert not found.tied[0]


def test_a_levelled_chamber_stops_growing_and_says_so() -> None:
    # 3 local seats for one list vote in a thousand would need some 3,000 seats.
    found = by_hand("levelled", votes=[999.0, 1.0], local=[2, 3], seats=10)
    assert found.stopped[0]
    assert found.seats.tolist() == [[GROWTH_LIMIT * 10, 3]]


def local_seats(parties: int) -> st.SearchStrategy[list[int]]:
    return st.lists(st.integers(0, 6), min_size=parties, max_size=parties)


elections = st.integers(1, 5).flatmap(
    lambda parties: st.tuples(
        st.lists(st.integers(0, 30), min_size=parties, max_size=parties).filter(any), local_seats(parties)
    )
)


def ask(
    election: tuple[list[int], list[int]],
    extra: int,
    method: ListMethod,
    overhang: str,
    lot: np.ndarray,
    ties: str = "lot",
) -> Compensated:
    votes, local = (np.array([row]) for row in election)
    return compensate(
        votes.astype(float),
        local=local,
        seats=int(local.sum()) + extra,
        method=method,
        overhang=overhang,
        lot=lot[None],
        ties=ties,
    )


@given(elections, st.integers(0, 12), methods, st.sampled_from(OVERHANG_RULES), tie_rules, st.integers(0, 99))
@settings(max_examples=200, deadline=None)
def test_nobody_loses_a_local_seat_and_only_within_keeps_the_size(
    election: tuple[list[int], list[int]],
    extra: int,
    method: ListMethod,
    overhang: str,
    ties: str,
    seed: int,
) -> None:
    votes, local = election
    found = ask(election, extra, method, overhang, tickets(len(votes), seed=seed), ties)
    assert (found.seats[0] >= local).all()
    regular = sum(local) + extra
    assert found.seats.sum() == regular if overhang == "within" else found.seats.sum() >= regular
    for party, of_party in enumerate(votes):
        if of_party == 0:
            assert found.seats[0, party] == local[party]


@given(elections, st.integers(0, 12), divisor_methods, tie_rules, st.integers(0, 99))
@settings(max_examples=200, deadline=None)
def test_within_by_highest_averages_goes_on_from_the_local_seats(
    election: tuple[list[int], list[int]], extra: int, method: ListMethod, ties: str, seed: int
) -> None:
    # The definition takes rounds: who has more local seats than its part keeps them, the rest is shared out
    # again. For divisor methods that equals one count that starts from the local seats.
    votes, local = (np.array(row) for row in election)
    lot = tickets(len(votes), seed=seed)
    keeps = votes == 0
    while True:
        part = apportion(
            np.where(keeps, 0, votes)[None].astype(float),
            seats=int(local.sum() + extra - local[keeps].sum()),
            method=method,
            lot=lot[None],
            ties=ties,
        ).seats[0]
        expected = np.where(keeps, local, part)
        if (expected >= local).all():
            break
        keeps |= local > expected
    found = ask(election, extra, method, "within", lot, ties)
    assert found.seats[0].tolist() == expected.tolist()


@given(elections, st.integers(0, 12), methods, tie_rules, st.integers(0, 99))
@settings(max_examples=300, deadline=None)
def test_levelled_is_the_smallest_chamber_in_which_all_have_their_local_seats(
    election: tuple[list[int], list[int]], extra: int, method: ListMethod, ties: str, seed: int
) -> None:
    votes, local = election
    lot = tickets(len(votes), seed=seed)
    found = ask(election, extra, method, "levelled", lot, ties)
    inside = [won if of_party else 0 for won, of_party in zip(local, votes, strict=True)]
    outside = sum(local) - sum(inside)
    for size in range(sum(inside) + extra, GROWTH_LIMIT * (sum(local) + extra) - outside + 1):
        filled, tied = seats_in_fractions(votes, seats=size, method=method, lot=lot, ties=ties)
        if all(part >= won for part, won in zip(filled, inside, strict=True)):
            expected = [
                part if of_party else won for part, won, of_party in zip(filled, local, votes, strict=True)
            ]
            assert found.seats[0].tolist() == expected
            assert found.tied[0] == tied
            assert not found.stopped[0]
            return
    assert found.stopped[0]


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("overhang", OVERHANG_RULES)
def test_many_rows_equal_one_row_each(method: str, overhang: str) -> None:
    rng = np.random.default_rng(9)
    votes, lot = rng.dirichlet(np.full(5, 0.7), 40), rng.random((40, 5))
    local = rng.multinomial(10, [0.6, 0.2, 0.1, 0.1, 0], 40)
    seats = rng.integers(10, 30, 40)
    question = {"method": METHODS[method], "overhang": overhang}
    together = compensate(votes, local=local, seats=seats, lot=lot, **question)
    for row in range(40):
        here = slice(row, row + 1)
        alone = compensate(votes[here], local=local[here], seats=int(seats[row]), lot=lot[here], **question)
        np.testing.assert_array_equal(alone.seats[0], together.seats[row])
        assert alone.stopped[0] == together.stopped[row]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (
            {"local": [9, 2, 0]},
            "local: 1 rows, the first at position 0, have more local seats than the chamber",
        ),
        ({"local": [9, -2, 0]}, "local: expected a number of seats, zero or more, for every row and party"),
        ({"local": [1, 1]}, "local: expected a number of seats, zero or more, for every row and party"),
        (
            {"votes": [0.0, 0.0, 0.0]},
            "votes: 1 rows, the first at position 0, have seats to fill but no votes",
        ),
    ],
)
def test_questions_without_an_answer_are_refused(change: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        by_hand("kept", **change)


def test_an_unknown_rule_for_overhang_is_refused_with_the_known_ones() -> None:
    with pytest.raises(ValueError, match="overhang: got 'lost'; expected one of kept, levelled, within"):
        by_hand("lost")
