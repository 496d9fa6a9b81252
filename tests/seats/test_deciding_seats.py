"""Which seats decide a majority: a worked example, independent seats by theory, and what always holds."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.seats.deciding_seats import find_deciding_seats

CODES = ("FER", "LAN", "HED")


def chamber(votes: np.ndarray, *, elsewhere: np.ndarray | None = None, magnitude: list[int] | None = None):
    """Seats won by most votes; ``votes`` has dims (draw, seat, party), ``elsewhere`` (draw, party)."""
    won = (votes == votes.max(axis=-1, keepdims=True)).astype(np.int8)
    total = won.sum(axis=1, dtype=np.int16)
    if elsewhere is not None:
        total = total + elsewhere
    names = [f"S{place}" for place in range(votes.shape[1])]
    dims = ("chain", "draw", "seat", "party")
    data = xr.Dataset(
        {
            "won": (dims, won[None]),
            "seat_votes": (dims, votes[None].astype(np.float32)),
            "seats_polling_day": (("chain", "draw", "party"), total[None].astype(np.int16)),
        },
        coords={"seat": names, "party": list(CODES[: votes.shape[2]])},
    )
    return data if magnitude is None else data.assign_coords(seat_magnitude=("seat", magnitude))


def two_parties(shares: list[list[float]]) -> np.ndarray:
    """Votes of FER and LAN, dims (draw, seat, party), from the shares of FER."""
    first = np.array(shares)
    return np.stack([first, 1 - first], axis=-1)


def test_the_seat_at_the_line_is_found_by_hand():
    # Three seats, majority 2: the second in the order of FER's lead decides.
    votes = two_parties([[0.60, 0.55, 0.40], [0.60, 0.45, 0.52], [0.30, 0.45, 0.40], [0.70, 0.80, 0.75]])
    found = find_deciding_seats(chamber(votes), members=["FER"], majority=2)
    assert found["decides"].values.tolist() == [0.0, 0.25, 0.75]
    assert found["chance"].values.tolist() == [0.75, 0.5, 0.5]
    # The code has a majority in exactly the draws in which it wins the seat that decides: here two and four.


def test_decides_sums_to_one_where_the_line_lies_within_the_seats():
    rng = np.random.default_rng(1)
    data = chamber(rng.dirichlet(np.ones(3), size=(300, 20)))
    for members in (["FER"], ["FER", "HED"]):
        found = find_deciding_seats(data, members=members, majority=11)
        assert float(found["decides"].sum()) == pytest.approx(1)


def test_seats_held_elsewhere_move_the_line_and_may_move_it_out_of_reach():
    # Needed in these seats: 3 less what is held elsewhere, that is 3, 2, 1, none, and 4 of 3.
    votes = two_parties([[0.6, 0.55, 0.4]] * 5)
    elsewhere = np.array([[0, 0], [1, 0], [2, 0], [3, 0], [-1, 0]])
    found = find_deciding_seats(chamber(votes, elsewhere=elsewhere), members=["FER"], majority=3)
    assert found["decides"].values.tolist() == pytest.approx([0.2, 0.2, 0.2])


def test_a_line_that_differs_from_draw_to_draw_is_followed():
    votes = two_parties([[0.6, 0.55, 0.4]] * 2)
    found = find_deciding_seats(chamber(votes), members=["FER"], majority=np.array([[1, 3]]))
    assert found["decides"].values.tolist() == [0.5, 0.0, 0.5]


def test_an_alliance_leads_with_its_strongest_member():
    # LAN and HED split a majority of S0 and lose it; in S1 HED leads FER by .10, in S2 LAN by .20.
    votes = np.array([[[0.40, 0.35, 0.25], [0.40, 0.10, 0.50], [0.30, 0.50, 0.20]]])
    found = find_deciding_seats(chamber(votes), members=["LAN", "HED"], majority=2)
    assert found["chance"].values.tolist() == [0.0, 1.0, 1.0]
    assert found["decides"].values.tolist() == [0.0, 1.0, 0.0]


def test_a_seat_won_in_a_run_off_stands_before_those_that_are_lost():
    # FER is second in the first round of S0 and wins the run-off; it leads in S1 and loses it.
    data = chamber(two_parties([[0.45, 0.55, 0.30]]))
    data["won"][0, 0] = [[1, 0], [0, 1], [0, 1]]
    found = find_deciding_seats(data, members=["FER"], majority=1)
    assert found["decides"].values.tolist() == [1.0, 0.0, 0.0]


def test_only_seats_of_one_member_are_looked_at():
    data = chamber(two_parties([[0.6, 0.55, 0.4]]), magnitude=[1, 3, 1])
    found = find_deciding_seats(data, members=["FER"], majority=2)
    assert found["seat"].values.tolist() == ["S0", "S2"]


def test_a_seat_where_the_code_does_not_stand_never_decides():
    votes = two_parties([[0.6, 0.4, 0.0]])
    found = find_deciding_seats(chamber(votes), members=["FER"], majority=3)
    assert found["stands"].values.tolist() == [True, True, False]
    assert found["decides"].values.tolist() == [0.0, 0.0, 0.0]


def test_what_independent_seats_carry_is_their_share_of_the_binomial_variance():
    """Seats won independently: var(total) is the sum of p (1 - p), and cov(won, total) is its own term."""
    rng = np.random.default_rng(2)
    p = np.linspace(0.03, 0.9, 12)
    won = rng.random((60_000, p.size)) < p
    data = chamber(two_parties(np.where(won, 0.6, 0.4)))
    found = find_deciding_seats(data, members=["FER"], majority=7)
    expected = p * (1 - p) / (p * (1 - p)).sum()
    # The standard error of such a covariance is about sqrt(p (1 - p) / S / var(total)), here .0012.
    assert found["carries"].values == pytest.approx(expected, abs=0.005)


def test_seats_that_swing_together_carry_more_than_one_that_swings_alone():
    rng = np.random.default_rng(3)
    common, own = rng.random(5000) < 0.5, rng.random(5000) < 0.5
    shares = np.where(np.stack([common, common, common, own], axis=1), 0.6, 0.4)
    carries = find_deciding_seats(chamber(two_parties(shares)), members=["FER"], majority=2)["carries"]
    # cov = 3/4 for each of the three and 1/4 for the last, of a variance of 9/4 + 1/4.
    assert carries.values == pytest.approx([0.3, 0.3, 0.3, 0.1], abs=0.01)


@settings(deadline=None)
@given(seed=st.integers(0, 1000), draws=st.integers(2, 30), seats=st.integers(1, 12), line=st.integers(1, 14))
def test_carries_sums_to_one_and_a_majority_is_the_deciding_seat_won(seed, draws, seats, line):
    votes = np.random.default_rng(seed).dirichlet(np.ones(3), size=(draws, seats))
    data = chamber(votes)
    found = find_deciding_seats(data, members=["FER"], majority=line)
    held = data["seats_polling_day"].sel(party="FER").values[0]
    if np.ptp(held):
        assert float(found["carries"].sum()) == pytest.approx(1, abs=1e-4)
    else:
        assert found["carries"].isnull().all()
    assert float(found["decides"].sum()) == pytest.approx(1.0 if line <= seats else 0.0)
    for draw in range(draws):
        one = find_deciding_seats(data.isel(draw=[draw]), members=["FER"], majority=line)
        won = float((one["chance"] * one["decides"]).sum())
        assert (won > 0.5) == (held[draw] >= line)
