"""What a desk relies on when it counts seats: sums, order, names, absence, monotone support."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from aggregator.inputs.contest import Contest
from aggregator.seats.baseline import BaselinePriors
from aggregator.seats.counting import count_seats
from aggregator.seats.local_noise import LocalPriors
from tests.made_up_draws import made_up_contest, made_up_draws, made_up_last_result

STILL = LocalPriors(slope_sd=0.0, noise_sd_median=1e-9)
STILL_BASELINE = BaselinePriors(unseen_sd=0.0)


def count(
    draws: xr.Dataset,
    *,
    seed: int = 1,
    result: pd.DataFrame | None = None,
    contest: Contest | None = None,
    still: bool = False,
) -> xr.Dataset:
    return count_seats(
        draws,
        last_result=made_up_last_result() if result is None else result,
        contest=contest or made_up_contest(),
        rng=np.random.default_rng(seed),
        local_priors=STILL if still else None,
        baseline_priors=STILL_BASELINE if still else None,
    )


@settings(max_examples=15, deadline=None)
@given(seed=st.integers(0, 10_000), seats_per_region=st.integers(1, 9))
def test_seats_sum_to_the_chamber_in_every_draw(seed: int, seats_per_region: int) -> None:
    result = made_up_last_result(seed=seed, seats_per_region=seats_per_region)
    seats = count(made_up_draws(seed=seed, draws=20, dates=3), seed=seed, result=result)
    assert seats.attrs["chamber"] == 3 * seats_per_region
    assert (seats["seats"].sum("party") == 3 * seats_per_region).all()
    assert (seats["seats_polling_day"].sum("party") == 3 * seats_per_region).all()
    np.testing.assert_allclose(seats["seat_chance"].sum("party"), 1, atol=1e-12)
    np.testing.assert_allclose(seats["seat_share"].sum("party"), 1, atol=1e-6)


@settings(max_examples=10, deadline=None)
@given(seed=st.integers(0, 10_000))
def test_order_of_seats_and_parties_in_the_files_changes_nothing(seed: int) -> None:
    draws, result, contest = made_up_draws(draws=30, dates=2), made_up_last_result(), made_up_contest()
    shuffle = np.random.default_rng(seed)
    shuffled = contest.model_copy(update={"parties": tuple(shuffle.permutation(contest.parties).tolist())})
    turned = draws.isel(
        party=shuffle.permutation(draws.sizes["party"]), region=shuffle.permutation(draws.sizes["region"])
    )
    rows = result.sample(frac=1, random_state=seed)
    plain = count(draws, seed=seed)
    other = count(turned, seed=seed, result=rows, contest=shuffled)
    assert list(other["seat"].values) == list(rows["seat"])
    xr.testing.assert_identical(
        plain.drop_attrs(), other.sel(seat=plain["seat"], party=plain["party"]).drop_attrs()
    )


def test_renaming_a_party_changes_nothing() -> None:
    draws, result, contest = made_up_draws(draws=200), made_up_last_result(), made_up_contest()
    new = {"FER": "ZED", "LAN": "AAA"}
    renamed = Contest.model_validate(
        {
            "title": contest.title,
            "polling_day": contest.polling_day,
            "party": [{**p.model_dump(), "code": new.get(p.code, p.code)} for p in contest.parties],
            "region": [r.model_dump() for r in contest.regions],
        }
    )
    codes = [new.get(c, c) for c in draws["party"].values]
    plain = count(draws, still=True)
    other = count(
        draws.assign_coords(party=codes), result=result.rename(columns=new), contest=renamed, still=True
    )
    back = other.assign_coords(party=draws["party"])
    np.testing.assert_array_equal(plain["seats"], back["seats"])
    np.testing.assert_allclose(plain["seat_share"], back["seat_share"], atol=1e-4)


def test_absent_party_wins_no_seat_and_gets_no_share() -> None:
    seats = count(made_up_draws(draws=200))
    away = seats.sel(seat=seats["seat_region"] == "SKERRY", party="HED")
    assert (away["seat_chance"] == 0).all()
    assert (away["seat_share"] == 0).all()


def test_turnout_weighted_seat_shares_are_the_regions_support() -> None:
    draws = made_up_draws(draws=100)
    seats = count(draws, still=True)
    votes = made_up_last_result().set_index("seat")[list(made_up_contest().party_codes)].sum(axis=1)
    weight = xr.DataArray(votes.to_numpy(), coords={"seat": votes.index.to_numpy(dtype=str)})
    for region in draws["region"].values:
        here = seats.sel(seat=seats["seat_region"] == region)
        mean = here["seat_share"].weighted(weight.sel(seat=here["seat"])).mean("seat")
        support = draws["support_polling_day"].sel(region=region).mean(("chain", "draw"))
        np.testing.assert_allclose(mean, support, atol=5e-5)


@settings(max_examples=25, deadline=None)
@given(
    seed=st.integers(0, 10_000),
    party=st.sampled_from(["FER", "LAN", "HED", "TID"]),
    factor=st.floats(1.01, 1.6),
)
def test_more_support_everywhere_never_costs_expected_seats(seed: int, party: str, factor: float) -> None:
    draws = made_up_draws(seed=seed, draws=40, dates=2)
    lifted = draws.copy()
    for name in ("support", "support_polling_day"):
        higher = draws[name] * xr.where(draws["party"] == party, factor, 1.0)
        lifted[name] = (higher / higher.sum("party")).astype(np.float32)
    before = count(draws, seed=seed)["seat_chance"].sel(party=party).sum()
    after = count(lifted, seed=seed)["seat_chance"].sel(party=party).sum()
    assert after >= before - 1e-9


def test_series_of_seats_moves_only_when_support_does() -> None:
    draws = made_up_draws(draws=50, dates=3)
    draws["support"][:] = draws["support"].isel(date=0)
    draws["support_polling_day"][:] = draws["support"].isel(date=0, drop=True)
    seats = count(draws)
    for date in range(3):
        np.testing.assert_array_equal(seats["seats"].isel(date=date), seats["seats_polling_day"])


def test_last_result_without_noise_or_swing_returns_the_seats_won_then() -> None:
    result, contest = made_up_last_result(), made_up_contest()
    # Without the newcomer, and without the seat where one candidate has to be imagined.
    codes = [c for c in contest.party_codes if c != "TID"]
    contest = contest.model_copy(update={"parties": tuple(p for p in contest.parties if p.code != "TID")})
    result = result[result["seat"] != "PO01"]
    draws = made_up_draws(draws=2, dates=1).sel(party=codes)
    cast = result.groupby("region")[codes].sum()
    shares = cast.div(cast.sum(axis=1), axis=0).loc[draws["region"].to_numpy()].to_numpy()
    for name in ("support", "support_polling_day"):
        draws[name] = (draws[name] * 0 + shares).astype(np.float32)
    seats = count(draws, result=result, contest=contest, still=True)
    won = result[codes].idxmax(axis=1).value_counts().reindex(codes, fill_value=0)
    np.testing.assert_array_equal(seats["seats_polling_day"].isel(chain=0, draw=0), won.to_numpy())
    np.testing.assert_allclose(seats["seat_share"], seats["last_share"], atol=5e-5)


def test_same_seed_gives_the_same_seats() -> None:
    draws = made_up_draws(draws=30)
    xr.testing.assert_identical(count(draws, seed=9), count(draws, seed=9))


def test_seats_in_a_region_without_support_are_refused() -> None:
    draws = made_up_draws(draws=2).drop_sel(region="PORT")
    with pytest.raises(ValueError, match="regions without support: PORT"):
        count(draws)


def test_support_for_a_party_where_it_does_not_stand_is_refused() -> None:
    draws = made_up_draws(draws=2)
    draws["support"].loc[{"region": "SKERRY", "party": "HED"}] = 0.1
    with pytest.raises(ValueError, match="where it does not stand"):
        count(draws)


def test_counted_seats_are_the_count_from_polling_day_on_and_estimates_before() -> None:
    draws, result, contest = made_up_draws(draws=60, dates=4), made_up_last_result(), made_up_contest()
    parties = list(draws["party"].to_numpy())
    counted = result[result["region"] == "DOWNS"].copy()
    votes = counted.reindex(columns=parties).fillna(0.0).to_numpy()
    # A count unlike the last result: every seat's votes handed on to the next seat, one party doubled.
    counted[parties] = np.roll(votes, 1, axis=0) * np.where(np.array(parties) == "HED", 2, 1)
    share = xr.DataArray((counted[parties].sum() / counted[parties].sum().sum()).to_numpy(), dims="party")
    voted = draws["date"].to_numpy()[2]
    known = (draws["region"] == "DOWNS") & (draws["date"] >= voted)
    draws["support"] = xr.where(known, share, draws["support"])
    draws["support_polling_day"] = xr.where(draws["region"] == "DOWNS", share, draws["support_polling_day"])
    early = pd.Timestamp(voted).date()
    regions = [
        region.model_copy(update={"polling_day": early}) if region.code == "DOWNS" else region
        for region in contest.regions
    ]
    seats = count_seats(
        draws,
        last_result=result,
        counted_result=counted,
        contest=contest.model_copy(update={"regions": tuple(regions)}),
        rng=np.random.default_rng(1),
    )
    winners = counted.set_index("seat")[parties].idxmax(axis=1)
    for seat, party in winners.items():
        assert seats["seat_chance"].sel(seat=seat, party=party) == 1
    np.testing.assert_allclose(
        seats["seat_share"].sel(seat=winners.index.to_numpy()).transpose("seat", "party"),
        counted[parties].div(counted[parties].sum(axis=1), axis=0),
        atol=1e-5,
    )
    assert (seats["seats"].sum("party") == len(result)).all()
    # HED was doubled by the count: before it, the draws did not know.
    jump = seats["seats"].sel(party="HED").mean(("chain", "draw")).diff("date")
    assert jump.sel(date=voted) > 1
