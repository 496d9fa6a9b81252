"""Combinations that reach a majority and need every member, against brute force over all subsets."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.seats import combinations as module
from aggregator.seats.combinations import find_combinations

CODES = ("FER", "LAN", "HED", "TID", "QUA")


def seats_of(won: np.ndarray, codes: tuple[str, ...] = CODES) -> xr.DataArray:
    """Seats of one chain, dims (draw, party) given."""
    return xr.DataArray(won[None], dims=("chain", "draw", "party"), coords={"party": list(codes)})


def by_brute_force(won: np.ndarray, line: np.ndarray, codes: tuple[str, ...]) -> dict[str, float]:
    """Chance of being minimal for every subset in which it is, by taking each member away in turn."""
    found = {}
    for size in range(1, len(codes) + 1):
        for members in combinations(range(len(codes)), size):
            total = won[:, members].sum(axis=1)
            minimal = total >= line
            for member in members:
                minimal &= total - won[:, member] < line
            if minimal.any():
                found["+".join(codes[m] for m in members)] = float(minimal.mean())
    return found


@settings(deadline=None)
@given(
    won=st.lists(st.lists(st.integers(0, 20), min_size=5, max_size=5), min_size=1, max_size=8),
    line=st.integers(1, 60),
)
def test_minimal_combinations_are_those_of_brute_force(won, line):
    seats = np.array(won, dtype=np.int16)
    lines = line + np.arange(len(won)) % 3  # a line that differs from draw to draw
    found = find_combinations(seats_of(seats), majority=lines[None], least_chance=0.0)
    chance = found["minimal"].mean(("chain", "draw"))
    assert dict(zip(found["combination"].values.tolist(), chance.values.tolist(), strict=True)) == (
        pytest.approx(by_brute_force(seats, lines, CODES))
    )


def test_what_a_combination_holds_and_reaches_is_counted_by_hand():
    # Chamber of 10, majority 6. FER alone in the first draw; there the two others are no majority.
    found = find_combinations(seats_of(np.array([[6, 3, 1], [4, 4, 2], [5, 3, 2]]), CODES[:3]), majority=6)
    pair = found.sel(combination="FER+LAN")
    assert pair["held"].values.tolist() == [[9, 8, 8]]
    assert pair["reaches"].values.tolist() == [[True, True, True]]
    assert pair["minimal"].values.tolist() == [[False, True, True]]
    assert pair["member"].values.tolist() == [True, True, False]
    assert found.sel(combination="FER")["minimal"].values.tolist() == [[True, False, False]]
    assert "FER+LAN+HED" not in found["combination"]


def test_the_likeliest_minimal_combination_comes_first_and_rare_ones_are_left_out():
    won = np.array([[5, 4, 1]] * 98 + [[4, 5, 1]] + [[10, 0, 0]], dtype=np.int16)
    found = find_combinations(seats_of(won, CODES[:3]), majority=6, least_chance=0.02)
    assert found["combination"].values.tolist() == ["FER+LAN", "FER+HED"]


def test_others_never_enter():
    codes = ("FER", "LAN", "OTH")
    found = find_combinations(seats_of(np.array([[4, 2, 4]]), codes), majority=6)
    assert found["combination"].values.tolist() == ["FER+LAN"]
    assert found["party"].values.tolist() == ["FER", "LAN"]


def test_where_nobody_can_reach_the_line_there_is_no_combination():
    found = find_combinations(seats_of(np.array([[2, 2, 1]]), CODES[:3]), majority=6)
    assert found.sizes["combination"] == 0
    assert found["held"].dims == ("combination", "chain", "draw")


def test_order_of_parties_only_orders_the_codes_in_a_name():
    rng = np.random.default_rng(3)
    won = rng.multinomial(60, np.full(5, 0.2), size=200).astype(np.int16)
    first = find_combinations(seats_of(won), majority=31)
    turned = find_combinations(seats_of(won[:, ::-1], CODES[::-1]), majority=31)
    chance = {
        frozenset(str(name).split("+")): float(value)
        for name, value in zip(
            turned["combination"].values, turned["minimal"].mean(("chain", "draw")), strict=True
        )
    }
    for name, value in zip(
        first["combination"].values, first["minimal"].mean(("chain", "draw")), strict=True
    ):
        assert chance[frozenset(str(name).split("+"))] == pytest.approx(float(value))


def test_only_the_likeliest_are_kept_where_there_are_very_many(monkeypatch):
    monkeypatch.setattr(module, "MOST_COMBINATIONS", 2)
    won = np.random.default_rng(4).multinomial(60, np.full(5, 0.2), size=200)
    assert find_combinations(seats_of(won), majority=31).sizes["combination"] == 2


def test_parties_beyond_the_largest_do_not_enter(monkeypatch):
    monkeypatch.setattr(module, "MOST_PARTIES", 2)
    found = find_combinations(seats_of(np.array([[1, 4, 3, 0, 2]])), majority=6)
    assert found["combination"].values.tolist() == ["LAN+HED"]
