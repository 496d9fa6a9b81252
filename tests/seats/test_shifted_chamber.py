"""Polling day counted again with shifted votes: whose votes are shifted, and that nothing else moves."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from aggregator.seats.counting import count_prepared
from aggregator.seats.prepare import prepare_seats
from aggregator.seats.seats_votes import seats_at_votes, votes_as_they_are
from aggregator.seats.shifted_chamber import choose_codes, choose_pairs, count_votes_to_seats
from tests.made_up_draws import made_up_contest, made_up_draws, made_up_last_result

CODES = ("FER", "LAN", "HED", "TID", "OTH")


def on_polling_day(*rows: tuple[float, ...]) -> xr.DataArray:
    """Votes or seats in each draw of one chain."""
    return xr.DataArray(
        np.array([rows]), dims=("chain", "draw", "party"), coords={"party": list(CODES[: len(rows[0])])}
    )


@pytest.fixture(scope="module")
def counted():
    draws, contest, result = made_up_draws(draws=60), made_up_contest(), made_up_last_result()
    prepared = prepare_seats(draws, last_result=result, contest=contest, rng=np.random.default_rng(1))
    seats = count_prepared(prepared, draws=draws, contest=contest, order=result["seat"])
    return seats, count_votes_to_seats(prepared, draws=draws, seats=seats, contest=contest)


def part(shifted: xr.Dataset, code: str) -> xr.Dataset:
    return shifted.isel(shift=np.flatnonzero(((shifted["code"] == code) & (shifted["against"] == "")).values))


def test_unmoved_votes_give_the_seats_that_were_counted(counted):
    seats, shifted = counted
    still = shifted.isel(shift=np.flatnonzero(shifted["log_factor"].values == 0))
    assert still.sizes["shift"] == len(set(zip(still["code"].values, still["against"].values, strict=True)))
    expected = seats["seats_polling_day"].transpose("chain", "draw", "party").values.reshape(-1, 5)
    for place in range(still.sizes["shift"]):
        found = still["seats"].isel(shift=place).sel(party=seats["party"]).values
        np.testing.assert_array_equal(found, expected)


def test_more_votes_never_cost_a_party_a_seat_and_others_fill_the_rest(counted):
    seats, shifted = counted
    fer = part(shifted, "FER")
    assert (np.diff(fer["votes"].sel(party="FER").values, axis=1) > 0).all()
    assert (np.diff(fer["seats"].sel(party="FER").values, axis=1) >= 0).all()
    assert (fer["seats"].sum("party") == seats.attrs["chamber"]).all()


def test_the_curve_runs_ten_points_to_either_side(counted):
    _, shifted = counted
    fer = part(shifted, "FER")
    curve = seats_at_votes(fer, members=["FER"])
    middle = votes_as_they_are(fer, members=["FER"]).mean()
    assert float(curve["votes"].min()) == pytest.approx(middle - 0.1, abs=0.011)
    assert float(curve["votes"].max()) == pytest.approx(middle + 0.1, abs=0.011)


def test_codes_near_a_majority_are_shifted_and_in_any_case_those_of_the_pairs():
    votes = on_polling_day((0.4, 0.35, 0.15, 0.08, 0.02), (0.38, 0.36, 0.16, 0.08, 0.02))
    seats = on_polling_day((7, 2, 1, 0, 0), (5, 3, 2, 0, 0))
    codes = choose_codes(votes, seats=seats, contest=made_up_contest())
    assert codes == {"FER": ("FER",), "LAN": ("LAN",), "GLOW": ("LAN", "HED")}


def test_pairs_are_the_two_largest_parties_and_the_two_largest_sides():
    votes = on_polling_day((0.4, 0.35, 0.15, 0.08, 0.02))
    contest = made_up_contest()
    assert choose_pairs(votes, contest=contest) == [("FER", "LAN"), ("GLOW", "FER")]
    assert choose_pairs(votes, contest=contest.model_copy(update={"alliances": ()})) == [("FER", "LAN")]


def test_an_alliance_is_never_set_against_its_own_member():
    votes = on_polling_day((0.1, 0.45, 0.35, 0.08, 0.02))
    assert choose_pairs(votes, contest=made_up_contest()) == [("LAN", "HED"), ("GLOW", "FER")]


def test_others_are_no_side():
    votes = on_polling_day((0.2, 0.1, 0.05, 0.05, 0.6))
    pairs = choose_pairs(votes, contest=made_up_contest())
    assert not any("OTH" in pair for pair in pairs)
