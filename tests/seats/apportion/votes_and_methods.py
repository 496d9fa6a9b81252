"""Methods and votes that the tests of this folder share; votes are small whole numbers, so ties abound."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

import numpy as np
from hypothesis import strategies as st

from aggregator.seats.apportion.exact import apportion_exactly, in_order_of_claim
from aggregator.seats.apportion.list_method import ListMethod, highest_averages, largest_remainder

DIVISOR_METHODS = {
    "dhondt": highest_averages("dhondt"),
    "sainte_lague": highest_averages("sainte_lague"),
    "modified_sainte_lague": highest_averages("modified_sainte_lague"),
    # First divisors on both sides of the usual ones.
    "first_divisor_1.2": highest_averages("modified_sainte_lague", first_divisor=Fraction("1.2")),
    "first_divisor_2.5": highest_averages("modified_sainte_lague", first_divisor=Fraction("2.5")),
}
QUOTA_METHODS = {"hare": largest_remainder("hare"), "droop": largest_remainder("droop")}
METHODS: dict[str, ListMethod] = {**DIVISOR_METHODS, **QUOTA_METHODS}

divisor_methods = st.sampled_from(list(DIVISOR_METHODS.values()))
quota_methods = st.sampled_from(list(QUOTA_METHODS.values()))
methods = st.sampled_from(list(METHODS.values()))
tie_rules = st.sampled_from(["lot", "most_votes"])


def vote_counts(*, most: int = 40, parties: int = 6) -> st.SearchStrategy[list[int]]:
    """Votes of one to six parties, at least one of them with some."""
    return st.lists(st.integers(0, most), min_size=1, max_size=parties).filter(any)


def tickets(parties: int, *, seed: int) -> np.ndarray:
    """One ticket per party, all different."""
    return np.random.default_rng(seed).random(parties)


def seats_in_fractions(
    votes: Sequence[int], *, seats: int, method: ListMethod, lot: np.ndarray, ties: str = "lot"
) -> tuple[list[int], bool]:
    """Seats and whether a tie was broken, without any floating point."""
    exact = apportion_exactly(votes, seats=seats, method=method)
    filled = list(exact.seats)
    order = in_order_of_claim(exact.tied, votes=votes, lot=lot.tolist(), ties=ties)
    for party in order[: exact.contested]:
        filled[party] += 1
    return filled, bool(exact.tied)
