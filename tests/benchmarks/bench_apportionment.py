"""How fast seats are shared out among lists, against plain numpy in the same run.

10,000 draws, 400 seats, 12 parties; then more and fewer seats, to see how the work grows. Run with

    pytest tests/benchmarks/bench_apportionment.py -n 0 -m benchmark -s
"""

from __future__ import annotations

import numba
import numpy as np
import pandas as pd
import pytest

from aggregator.seats.apportion.apportion import apportion
from aggregator.seats.apportion.compensation import OVERHANG_RULES, compensate
from aggregator.seats.apportion.list_method import (
    HighestAverages,
    LargestRemainder,
    ListMethod,
    highest_averages,
    largest_remainder,
)
from tests.benchmarks.bench_counting import fastest

DRAWS, SEATS, PARTIES = 10_000, 400, 12
# Each of these is counted again in fractions.
TIED_DRAWS = 500
METHODS: dict[str, ListMethod] = {
    "D'Hondt": highest_averages("dhondt"),
    "Sainte-Laguë": highest_averages("sainte_lague"),
    "modified Sainte-Laguë": highest_averages("modified_sainte_lague"),
    "Hare": largest_remainder("hare"),
    "Droop": largest_remainder("droop"),
}


def votes_and_lot() -> tuple[np.ndarray, np.ndarray]:
    """Shares of a chamber with large and small parties, and tickets."""
    rng = np.random.default_rng(1)
    return rng.dirichlet(np.linspace(8, 0.8, PARTIES), DRAWS), rng.random((DRAWS, PARTIES))


def numpy_averages(votes: np.ndarray, seats: int, method: HighestAverages) -> np.ndarray:
    """One seat at a time to the highest average, all draws at once."""
    filled = np.zeros(votes.shape, dtype=np.int64)
    row = np.arange(len(votes))
    first = float(method.first_divisor)
    averages = votes / first
    for _ in range(seats):
        party = averages.argmax(axis=1)
        filled[row, party] += 1
        averages[row, party] = votes[row, party] / (1 + method.step * filled[row, party])
    return filled


def numpy_remainders(votes: np.ndarray, seats: int, method: LargestRemainder) -> np.ndarray:
    """Full quotas, then the largest remainders by rank."""
    quotas = votes / votes.sum(axis=1, keepdims=True) * (seats + method.quota_seats)
    filled = np.floor(quotas).astype(np.int64)
    rank = (filled - quotas).argsort(axis=1).argsort(axis=1)
    return filled + (rank < seats - filled.sum(axis=1, keepdims=True))


def plain_numpy(votes: np.ndarray, seats: int, method: ListMethod) -> np.ndarray:
    """The reference of the method's kind."""
    if isinstance(method, HighestAverages):
        return numpy_averages(votes, seats, method)
    return numpy_remainders(votes, seats, method)


@pytest.mark.benchmark
def test_speed_against_plain_numpy() -> None:
    votes, lot = votes_and_lot()
    rows = {}
    for name, method in METHODS.items():
        question = {"seats": SEATS, "method": method, "lot": lot}
        apportion(votes, **question)  # compiled before the clock starts
        compiled, counted = fastest(lambda q=question: apportion(votes, **q), runs=10)  # type: ignore[misc]
        plain, expected = fastest(lambda m=method: plain_numpy(votes, SEATS, m))  # type: ignore[misc]
        np.testing.assert_array_equal(counted.seats, expected)
        threads = numba.get_num_threads()
        numba.set_num_threads(1)
        one_thread, _ = fastest(lambda q=question: apportion(votes, **q), runs=10)  # type: ignore[misc]
        numba.set_num_threads(threads)
        rows[name] = {
            "microseconds per draw": compiled / DRAWS * 1e6,
            "on one thread": one_thread / DRAWS * 1e6,
            "numpy (one thread)": plain / DRAWS * 1e6,
            "times as fast": plain / compiled,
            "on one thread, times": plain / one_thread,
        }
    print(f"\n{DRAWS} draws x {SEATS} seats x {PARTIES} parties")
    print(pd.DataFrame(rows).T.to_string(float_format=lambda x: f"{x:.3g}"))


@pytest.mark.benchmark
def test_work_by_number_of_seats() -> None:
    votes, lot = votes_and_lot()
    rows: dict[int, dict[str, float]] = {}
    for seats in (4, 40, 400, 4000):
        rows[seats] = {}
        for name, method in METHODS.items():
            question = {"seats": seats, "method": method, "lot": lot}
            apportion(votes, **question)
            seconds, _ = fastest(lambda q=question: apportion(votes, **q), runs=10)  # type: ignore[misc]
            rows[seats][name] = seconds / DRAWS * 1e6
    print("\nmicroseconds per draw, by seats")
    print(pd.DataFrame(rows).T.to_string(float_format=lambda x: f"{x:.3g}"))


@pytest.mark.benchmark
def test_cost_of_a_mixed_chamber_and_of_ties() -> None:
    votes, lot = votes_and_lot()
    # Local seats favour the large, as plurality does; nobody below 5 percent has list seats.
    votes[votes < 0.05] = 0
    rng = np.random.default_rng(2)
    local = np.stack([rng.multinomial(SEATS // 2, row**2 / (row**2).sum()) for row in votes])
    rows: dict[str, dict[str, float]] = {}
    for name, method in METHODS.items():
        rows[name] = {}
        for overhang in OVERHANG_RULES:
            question = {"local": local, "seats": SEATS, "method": method, "overhang": overhang, "lot": lot}
            compensate(votes, **question)  # type: ignore[arg-type]
            seconds, _ = fastest(lambda q=question: compensate(votes, **q))  # type: ignore[misc]
            rows[name][overhang] = seconds / DRAWS * 1e6
        even = {"seats": SEATS - 1, "method": method, "lot": lot[:TIED_DRAWS]}
        seconds, counted = fastest(lambda q=even: apportion(np.ones((TIED_DRAWS, PARTIES)), **q))  # type: ignore[misc]
        assert counted.tied.all()
        rows[name]["every draw tied"] = seconds / TIED_DRAWS * 1e6
    print(f"\nmicroseconds per draw; {SEATS // 2} local seats of {SEATS}")
    print(pd.DataFrame(rows).T.to_string(float_format=lambda x: f"{x:.3g}"))
