"""Other forms of swing on the same draws: by hand where nothing strays, and in the mean whatever strays."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.seats.baseline import BaselinePriors
from aggregator.seats.counting import count_seats
from aggregator.seats.local_noise import LocalPriors
from aggregator.seats.swing_forms import SwingForm
from tests.made_up_draws import made_up_contest, made_up_draws, made_up_last_result

STILL = LocalPriors(slope_sd=0.0, noise_sd_median=1e-9, noise_sd_log_sd=0.0)


def undated(draws: xr.Dataset) -> xr.Dataset:
    final = draws[["support_polling_day"]]
    return final.assign(support=final["support_polling_day"].expand_dims(date=pd.DatetimeIndex([])))


def votes_by_seat(form: SwingForm, priors: LocalPriors | None = None) -> tuple[pd.DataFrame, np.ndarray]:
    """Last and expected shares (seat) of FER in DOWNS, and FER's drawn support there."""
    draws = undated(made_up_draws(draws=30, chains=1))
    seats = count_seats(
        draws, last_result=made_up_last_result(), contest=made_up_contest(), form=form,
        rng=np.random.default_rng(2), local_priors=priors, baseline_priors=BaselinePriors(unseen_sd=0.0),
    )  # fmt: skip
    here = (seats["seat_region"] == "DOWNS").to_numpy()
    now = seats["seat_votes"].isel(chain=0, seat=here).sel(party="FER").to_numpy()
    last = seats["last_share"].isel(seat=here).sel(party="FER").to_numpy()
    return pd.DataFrame({"last": last, "now": now.mean(axis=0)}), now


def test_uniform_swing_adds_the_same_points_in_every_seat() -> None:
    """A newcomer's share has to come from somewhere, so that seats stray a little from exact uniformity."""
    table, _ = votes_by_seat(SwingForm.ADDITIVE, STILL)
    points = table["now"] - table["last"]
    assert points.std() < 0.012
    other, _ = votes_by_seat(SwingForm.PROPORTIONAL, STILL)
    assert (other["now"] - other["last"]).std() > points.std()


@pytest.mark.parametrize("form", SwingForm)
def test_every_form_meets_the_support_of_the_region(form: SwingForm) -> None:
    contest = made_up_contest()
    draws, result = undated(made_up_draws(draws=20, chains=1)), made_up_last_result(seats_per_region=30)
    seats = count_seats(
        draws, last_result=result, contest=contest, form=form, rng=np.random.default_rng(2),
        local_priors=STILL, baseline_priors=BaselinePriors(unseen_sd=0.0),
    )  # fmt: skip
    parties = list(contest.party_codes)
    votes = result.set_index("seat")[parties].sum(axis=1)
    for region in contest.region_codes:
        here = (seats["seat_region"] == region).to_numpy()
        weight = votes[seats["seat"].to_numpy()[here]].to_numpy()
        mean = np.average(seats["seat_votes"].isel(chain=0, seat=here).to_numpy(), axis=1, weights=weight)
        wanted = draws["support_polling_day"].isel(chain=0).sel(region=region, party=seats["party"])
        np.testing.assert_allclose(mean, wanted.to_numpy(), atol=5e-4)


def test_forms_share_their_noise() -> None:
    """Seats that stray far in one form do so in the other: the draws are the same."""
    _, log_ratio = votes_by_seat(SwingForm.PROPORTIONAL)
    _, additive = votes_by_seat(SwingForm.ADDITIVE)
    stray = [v - v.mean(axis=0) for v in (log_ratio, additive)]
    assert np.corrcoef(stray[0].ravel(), stray[1].ravel())[0, 1] > 0.9


def test_uniform_swing_is_counted_on_polling_day_only() -> None:
    contest: Contest = made_up_contest()
    with pytest.raises(ValueError, match="polling day only"):
        count_seats(
            made_up_draws(draws=2), last_result=made_up_last_result(), contest=contest,
            form=SwingForm.ADDITIVE, rng=np.random.default_rng(1),
        )  # fmt: skip
