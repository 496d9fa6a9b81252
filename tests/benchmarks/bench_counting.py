"""How fast seats are counted, against plain numpy and against what exponentials alone would cost.

4,000 draws, 540 seats in 8 regions, 8 parties, 60 dates: about a thousand million cells. Run with

    pytest tests/benchmarks/bench_counting.py -n 0 -m benchmark -s
"""

from __future__ import annotations

from collections.abc import Callable
from resource import RUSAGE_SELF, getrusage
from time import perf_counter
from typing import Any

import numpy as np
import pandas as pd
import pytest

from aggregator.seats.plurality import count_firsts
from aggregator.seats.recentring import solve_multipliers
from aggregator.seats.rules import SeatVotes

DRAWS, SEATS, PARTIES, DATES, REGIONS = 4000, 540, 8, 60, 8
# Plain numpy is timed on a part of the dates and scaled up.
NUMPY_DATES = 3


def fastest[Result](work: Callable[[], Result], *, runs: int = 3) -> tuple[float, Result]:
    """Seconds of the fastest run, and its result."""
    seconds = []
    for _ in range(runs):
        start = perf_counter()
        result = work()
        seconds.append(perf_counter() - start)
    return min(seconds), result


def chamber(*, draws: int = DRAWS, seats: int = SEATS, dates: int = DATES) -> dict[str, Any]:
    """Strength and support of the size of a large national chamber; support drifts from week to week."""
    rng = np.random.default_rng(1)
    region_start = np.round(np.linspace(0, seats, REGIONS + 1)).astype(np.int64)
    size = np.diff(region_start)
    level = np.log(rng.dirichlet(np.full(PARTIES, 3.0), REGIONS))
    base = np.repeat(level, size, axis=0).T + rng.normal(0, 0.4, (PARTIES, seats))
    strength = rng.standard_normal((draws, PARTIES, seats), dtype=np.float32)
    strength = np.exp(np.float32(0.15) * strength + base.astype(np.float32))
    steps = rng.standard_normal((draws, dates, REGIONS, PARTIES), dtype=np.float32)
    steps[:, 0] += 1
    log_support = level.astype(np.float32) + np.float32(0.03) * steps.cumsum(axis=1)
    support = np.exp(log_support)
    support /= support.sum(axis=-1, keepdims=True)
    weight = np.repeat(1 / size, size).astype(np.float32)
    return {"strength": strength, "support": support, "weight": weight, "region_start": region_start}


def numpy_count(votes: SeatVotes, *, dates: int) -> np.ndarray:
    """Seats by a plain argmax, one date at a time to spare memory."""
    of_seat = np.repeat(np.arange(REGIONS), np.diff(votes.region_start))
    seats = []
    for date in range(dates):
        factor = votes.multiplier[:, date, of_seat].transpose(0, 2, 1)
        winner = (votes.strength * factor).argmax(axis=1)
        seats.append(np.stack([(winner == party).sum(axis=1) for party in range(PARTIES)], axis=-1))
    return np.stack(seats, axis=1)


@pytest.mark.benchmark
def test_speed_of_counting() -> None:
    inputs = chamber()
    small = {**inputs, "strength": inputs["strength"][:2], "support": inputs["support"][:2]}
    lot = np.random.default_rng(2).random((DRAWS, SEATS), dtype=np.float32)
    start = inputs["region_start"]

    solve_multipliers(**small)  # compiled before the clock starts
    count_firsts(SeatVotes(small["strength"], solve_multipliers(**small).multiplier, start, lot[:2]))

    # A share by log-ratios takes one exponential for every draw, date, seat and party; measured on one date.
    exponentials, _ = fastest(lambda: np.exp(inputs["strength"]))
    exponentials *= DATES
    solving, solved = fastest(lambda: solve_multipliers(**inputs))
    votes = SeatVotes(inputs["strength"], solved.multiplier, start, lot)
    counting, counted = fastest(lambda: count_firsts(votes))
    plain, expected = fastest(lambda: numpy_count(votes, dates=NUMPY_DATES), runs=1)
    plain *= DATES / NUMPY_DATES

    # Single precision ties about one seat in ten million; numpy gives it to the first party, we draw lots.
    moved = np.abs(counted.seats[:, :NUMPY_DATES] - expected).sum() / 2
    assert moved / (expected.sum()) < 1e-6
    seconds = np.array([plain, counting, solving, solving + counting, exponentials])
    table = pd.DataFrame(
        {
            "seconds": seconds,
            "numpy count = 1": seconds / plain,
            "exponentials = 1": seconds / exponentials,
        },
        index=[
            f"numpy count (from {NUMPY_DATES} of {DATES} dates)",
            "compiled count",
            "re-centring",
            "re-centring and count",
            f"exponentials alone (from one of {DATES} dates)",
        ],
    )
    print(f"\n{DRAWS} draws x {SEATS} seats x {PARTIES} parties x {DATES} dates")
    print(table.to_string(float_format=lambda x: f"{x:.4g}"))
    print(f"most memory of the process: {getrusage(RUSAGE_SELF).ru_maxrss / 2**20:.2f} GiB")
    print(f"largest gap between a region's mean and its support: {solved.largest_gap:.2g}")


@pytest.mark.benchmark
def test_time_grows_in_proportion_to_draws_seats_and_dates() -> None:
    """Half of one of the three against half of the time."""

    def seconds(**size: int) -> float:
        inputs = chamber(**size)
        n_draws, _, n_seats = inputs["strength"].shape
        lot = np.random.default_rng(2).random((n_draws, n_seats), dtype=np.float32)

        def work() -> None:
            solved = solve_multipliers(**inputs)
            count_firsts(SeatVotes(inputs["strength"], solved.multiplier, inputs["region_start"], lot))

        return fastest(work)[0]

    seconds(draws=4)
    whole = seconds()
    print()
    for name, size in (("draws", DRAWS), ("seats", SEATS), ("dates", DATES)):
        print(f"half the {name}: {seconds(**{name: size // 2}) / whole:.2f} of the time")
