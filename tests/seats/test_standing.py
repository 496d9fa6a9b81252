"""Who stands where: what a party without a candidate loses, and what a sitting member brings."""

from __future__ import annotations

from datetime import date

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.seats.baseline import BaselinePriors
from aggregator.seats.counting import count_seats
from aggregator.seats.local_noise import LocalPriors
from tests.made_up_draws import made_up_draws

STILL = LocalPriors(slope_sd=0.0, noise_sd_median=1e-9, noise_sd_log_sd=0.0)
SEATS = [f"S{i}" for i in range(8)]
POLLED = {"FER": 0.50, "LAN": 0.44, "TID": 0.06}


def contest() -> Contest:
    return Contest.model_validate(
        {
            "title": "Council of the Saltmarsh Isles 2033",
            "polling_day": date(2033, 5, 15),
            "party": [{"code": c, "name": c} for c in POLLED],
            "others": False,
            "region": [{"code": "DOWNS", "name": "Downs"}],
        }
    )


def last_result(*, stood: list[str]) -> pd.DataFrame:
    """Eight equal seats in which TID had 6 % where it stood."""
    rows = [[s, s, "DOWNS", 500, 440, 60] if s in stood else [s, s, "DOWNS", 530, 470, np.nan] for s in SEATS]
    return pd.DataFrame(rows, columns=["seat", "name", "region", *POLLED])


def draws() -> xr.Dataset:
    made = made_up_draws(draws=2, chains=1, dates=1).isel(region=[0])
    support = xr.DataArray([[list(POLLED.values())]] * 2, dims=("draw", "region", "party")).astype("float32")
    final = xr.Dataset({"support_polling_day": support.expand_dims(chain=1)})
    final = final.assign_coords(party=list(POLLED), region=["DOWNS"], chain=[0], draw=[0, 1])
    return final.assign(support=final["support_polling_day"].expand_dims(date=made["date"]))


def standing_in(seats: list[str], *, holder: dict[str, str] | None = None) -> pd.DataFrame:
    """Candidates: FER and LAN everywhere, TID in some seats; the sitting members that stand again."""
    holder = holder or {}
    rows = [
        {"seat": s, "code": c, "name": "", "holder": holder.get(s) == c}
        for s in SEATS
        for c in POLLED
        if c != "TID" or s in seats
    ]
    return pd.DataFrame(rows)


def shares(
    candidates: pd.DataFrame | None, *, stood: list[str], before_last: pd.DataFrame | None = None,
    priors: LocalPriors = STILL,
) -> pd.DataFrame:  # fmt: skip
    """Votes by seat (rows) and party, of the first draw."""
    counted = count_seats(
        draws(), last_result=last_result(stood=stood), contest=contest(), candidates=candidates,
        before_last=before_last, rng=np.random.default_rng(1), local_priors=priors,
        baseline_priors=BaselinePriors(unseen_sd=0.0),
    )  # fmt: skip
    return counted["seat_votes"].isel(chain=0, draw=0).to_pandas()


def test_party_of_6_percent_in_half_the_seats_gets_its_polled_support_there_and_not_twice_it() -> None:
    """It stood everywhere last time: 6 % of all voters want it, and half of them find no candidate."""
    votes = shares(standing_in(SEATS[:4]), stood=SEATS)["TID"]
    np.testing.assert_allclose(votes[:4], 0.06, atol=1e-4)
    np.testing.assert_array_equal(votes[4:], 0.0)


def test_party_whose_slate_is_unchanged_has_its_support_in_its_own_seats() -> None:
    """It stood in the same half last time: the 6 % that polls find are twelve in a hundred there."""
    votes = shares(standing_in(SEATS[:4]), stood=SEATS[:4])["TID"]
    np.testing.assert_allclose(votes[:4], 0.12, atol=1e-3)
    np.testing.assert_array_equal(votes[4:], 0.0)


def test_votes_of_an_absent_party_are_lost_and_the_others_keep_their_proportion() -> None:
    votes = shares(standing_in(SEATS[:4]), stood=SEATS)
    assert (votes["FER"] / votes["LAN"])[4:].to_numpy() == pytest.approx(0.50 / 0.44, abs=1e-3)
    np.testing.assert_allclose(votes.sum(axis=1), 1, atol=1e-6)


def test_without_the_file_everybody_stands_everywhere_and_full_slates_change_nothing() -> None:
    none, full = shares(None, stood=SEATS), shares(standing_in(SEATS), stood=SEATS)
    pd.testing.assert_frame_equal(none, full)
    part = standing_in([]).query("seat == 'S0'")
    votes = shares(part, stood=SEATS)["TID"]
    assert votes["S0"] == 0
    assert (votes[1:] > 0.05).all()


PULL = LocalPriors(
    slope_sd=0.0, noise_sd_median=1e-9, noise_sd_log_sd=0.0, incumbency=0.08, incumbency_sd=0.0
)


def odds(votes: pd.DataFrame, seat: str) -> float:
    return float(np.log(votes.loc[seat, "FER"] / votes.loc[seat, "LAN"]))


def test_member_elected_last_time_brings_a_pull_that_one_who_sat_before_has_shown_already() -> None:
    """FER won all seats last time; the one before it won S0 alone. In S2 the member retires."""
    before = last_result(stood=SEATS)
    before.loc[before["seat"] != "S0", ["FER", "LAN"]] = [400, 540]
    found = standing_in(SEATS, holder={"S0": "FER", "S1": "FER"})
    votes = shares(found, stood=SEATS, before_last=before, priors=PULL)
    # S0 sat before and sits again: no change. S1 is new: the pull. S2: was not held before, none now.
    assert odds(votes, "S1") - odds(votes, "S0") == pytest.approx(0.08, abs=1e-3)
    assert odds(votes, "S2") - odds(votes, "S0") == pytest.approx(0.0, abs=1e-3)


def test_retiring_member_takes_the_pull_along() -> None:
    found = standing_in(SEATS, holder={s: "FER" for s in SEATS if s != "S3"})
    votes = shares(found, stood=SEATS, before_last=last_result(stood=SEATS), priors=PULL)
    assert odds(votes, "S3") - odds(votes, "S0") == pytest.approx(-0.08, abs=1e-3)
