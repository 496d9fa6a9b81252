"""Every rule, from draws to seats: sums, hand-worked counts, mixed chambers, places that count apart."""

from __future__ import annotations

from datetime import date
from typing import Any

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.seats.baseline import BaselinePriors
from aggregator.seats.counting import count_seats, count_shifted
from aggregator.seats.local_noise import LocalPriors
from aggregator.seats.prepare import prepare_seats
from tests.made_up_draws import made_up_contest, made_up_draws, made_up_last_result

STILL = LocalPriors(slope_sd=0.0, noise_sd_median=1e-9, noise_sd_log_sd=0.0)
STILL_BASELINE = BaselinePriors(unseen_sd=0.0)
DHONDT = {"rule": "highest_averages", "divisors": "dhondt"}
REGIONS = ("SKERRY", "DOWNS", "PORT")


def contest_with(counting: dict[str, Any], **changes: Any) -> Contest:
    plain = made_up_contest().model_dump(by_alias=True, exclude={"counting"})
    return Contest.model_validate({**plain, "counting": counting, **changes})


def with_members(result: pd.DataFrame, members: int) -> pd.DataFrame:
    return result.assign(seats=members, cluster="")


def transfers_of(contest: Contest, rate: float = 40.0, sd: float = 0.0) -> pd.DataFrame:
    pairs = [(a, b) for a in contest.party_codes for b in contest.party_codes if a != b]
    return pd.DataFrame(pairs, columns=["from", "to"]).assign(rate=rate, sd=sd)


def count(
    contest: Contest, draws: xr.Dataset, result: pd.DataFrame, *, seed: int = 3, **options: Any
) -> xr.Dataset:
    return count_seats(draws, last_result=result, contest=contest, rng=np.random.default_rng(seed), **options)


ALL_RULES = {
    "plurality": ({"rule": "plurality"}, 1, 24),
    "two_round": ({"rule": "two_round"}, 1, 24),
    "two_round_threshold": ({"rule": "two_round", "run_off_threshold": 12.5}, 1, 24),
    "districts": (DHONDT, 4, 96),
    "districts_hare": ({"rule": "largest_remainder"}, 4, 96),
    "regions": ({**DHONDT, "across": "region", "threshold": 5.0}, 4, 96),
    "country": ({"rule": "highest_averages", "divisors": "sainte_lague", "across": "country"}, 4, 96),
    "parallel": ({"rule": "mixed_parallel", "list_seats": 20, "threshold": 4.0}, 1, 44),
    "kept": ({"rule": "mixed_compensatory", "list_seats": 20, "overhang": "kept"}, 1, 44),
    "within": ({"rule": "mixed_compensatory", "list_seats": 20, "overhang": "within"}, 1, 44),
    "levelled": (
        {"rule": "mixed_compensatory", "list_seats": 20, "overhang": "levelled"},
        1,
        44,
    ),
}


@pytest.mark.parametrize("name", ALL_RULES)
def test_seats_sum_to_the_chamber_and_only_overhang_adds_to_it(name: str) -> None:
    counting, members, chamber = ALL_RULES[name]
    contest = contest_with(counting)
    draws = made_up_draws(draws=40, dates=2)
    seats = count(
        contest, draws, with_members(made_up_last_result(), members), transfers=transfers_of(contest)
    )
    assert seats.attrs["chamber"] == chamber
    for found in (seats["seats"].sum("party"), seats["seats_polling_day"].sum("party")):
        assert (found >= chamber).all()
        if name not in ("kept", "levelled"):
            assert (found == chamber).all()
    assert (seats["seats"] >= 0).all()
    # TID stands everywhere without a vote last time; HED does not stand in SKERRY.
    if "won" in seats:
        by_row = seats["won"].sum("party")
        assert (by_row == members).all()
        in_skerry = (seats["seat_region"] == "SKERRY").to_numpy()
        assert (seats["won"].sel(party="HED").isel(seat=in_skerry) == 0).all()
        local = seats["won"].sum("seat")
        from_lists = seats.get("list_seats_polling_day", 0)
        xr.testing.assert_equal(
            (local + from_lists).astype(int), seats["seats_polling_day"].drop_attrs().astype(int)
        )


@pytest.mark.parametrize("name", ALL_RULES)
def test_order_of_rows_regions_and_parties_changes_nothing_under_any_rule(name: str) -> None:
    counting, members, _ = ALL_RULES[name]
    contest = contest_with(counting)
    plain = contest.model_copy()
    turned = contest.model_copy(update={"parties": contest.parties[::-1], "regions": contest.regions[::-1]})
    draws, result = made_up_draws(draws=15, dates=2), with_members(made_up_last_result(), members)
    other_draws = draws.isel(party=slice(None, None, -1), region=slice(None, None, -1))
    shuffled = result.sample(frac=1, random_state=4)
    rates = transfers_of(contest)
    one = count(plain, draws, result, transfers=rates)
    two = count(turned, other_draws, shuffled, transfers=rates.iloc[::-1])
    for variable in ("seats", "seats_polling_day"):
        xr.testing.assert_equal(one[variable], two[variable].sel(party=one["party"]))


def fixed_draws(shares: dict[str, dict[str, float]]) -> xr.Dataset:
    """Draws that all say the same on one date and on polling day."""
    draws = made_up_draws(draws=3, chains=1, dates=1)
    for region, by_party in shares.items():
        for party in draws["party"].to_numpy():
            for name in ("support", "support_polling_day"):
                draws[name].loc[{"region": region, "party": party}] = by_party.get(str(party), 0.0)
    return draws.drop_vars("turnout_weight", errors="ignore")


def test_list_districts_give_each_its_members_by_hand() -> None:
    """60, 28, 12 for five members: 4-1-0 by D'Hondt, 3-1-1 by Sainte-Laguë (Gallagher 1991, table 1)."""
    result = pd.DataFrame(
        [[f"{r}1", r, r, 600, 280, 120, 0, 0, 5, ""] for r in REGIONS],
        columns=["seat", "name", "region", "FER", "LAN", "HED", "TID", "OTH", "seats", "cluster"],
    )
    same = {"FER": 0.6, "LAN": 0.28, "HED": 0.12}
    # HED stands in every region here.
    everywhere = [{"code": c, "name": c} for c in ("FER", "LAN", "HED", "TID")]
    for divisors, wanted in (("dhondt", (4, 1, 0)), ("sainte_lague", (3, 1, 1))):
        contest = contest_with({"rule": "highest_averages", "divisors": divisors}, party=everywhere)
        seats = count(
            contest, fixed_draws(dict.fromkeys(REGIONS, same)), result,
            local_priors=STILL, baseline_priors=STILL_BASELINE,
        )  # fmt: skip
        found = seats["won"].sel(party=["FER", "LAN", "HED"]).isel(chain=0)
        assert (found == np.array(wanted)).all()


def test_others_win_no_list_seat_and_count_towards_the_threshold() -> None:
    """Others have 30 %, so that a party of 4.5 % of all misses 5 %, though it has 6.4 % of the rest."""
    same = {"FER": 0.4, "LAN": 0.255, "TID": 0.045, "OTH": 0.3}
    contest = contest_with({**DHONDT, "across": "country", "threshold": 5.0})
    seats = count(contest, fixed_draws(dict.fromkeys(REGIONS, same)), with_members(made_up_last_result(), 1))
    final = seats["seats_polling_day"].isel(chain=0, draw=0)
    assert int(final.sel(party="OTH")) == 0
    assert int(final.sel(party="TID")) == 0
    assert final.sel(party=["FER", "LAN"]).to_numpy().tolist() == [15, 9]
    exempt = contest_with({**DHONDT, "across": "country", "threshold": 5.0, "exempt": ["TID"]})
    free = count(exempt, fixed_draws(dict.fromkeys(REGIONS, same)), with_members(made_up_last_result(), 1))
    assert int(free["seats_polling_day"].isel(chain=0, draw=0).sel(party="TID")) == 1


def test_threshold_over_the_country_holds_in_districts() -> None:
    """HED has 31 % in DOWNS and 14 % of the country: 20 % there shut it out, 10 % do not."""
    result = with_members(made_up_last_result(), 4)
    shares = {
        "SKERRY": {"FER": 0.6, "LAN": 0.4},
        "DOWNS": {"FER": 0.4, "LAN": 0.29, "HED": 0.31},
        "PORT": {"FER": 0.5, "LAN": 0.42, "HED": 0.08},
    }
    won = {}
    for threshold in (10.0, 20.0):
        contest = contest_with({**DHONDT, "threshold": threshold, "threshold_across": "country"})
        seats = count(contest, fixed_draws(shares), result)
        won[threshold] = int(seats["seats_polling_day"].sel(party="HED").max())
    assert won[20.0] == 0 < won[10.0]


def test_joint_list_passes_together_and_shares_its_seats_among_members() -> None:
    """Allies of 12 and 6 % pass 15 % as one list: 60:22:18 over 24 seats is 15-5-4 by D'Hondt, inside 3-1."""
    same = {"FER": 0.6, "OTH": 0.0, "LAN": 0.12, "HED": 0.06, "TID": 0.22}
    everywhere = [{"code": c, "name": c} for c in ("FER", "LAN", "HED", "TID")]
    pact = {"code": "GLOW", "name": "Glow Pact", "members": ["LAN", "HED"], "joint_list": True}
    counting = {**DHONDT, "across": "country", "threshold": 15.0}
    draws = fixed_draws(dict.fromkeys(REGIONS, same))
    result = with_members(made_up_last_result(), 1)
    together = count(contest_with(counting, party=everywhere, alliance=[pact]), draws, result)
    found = together["seats_polling_day"].isel(chain=0, draw=0).sel(party=["FER", "TID", "LAN", "HED"])
    assert found.to_numpy().tolist() == [15, 5, 3, 1]
    late = {**pact, "from": date(2033, 4, 1)}
    before = count(contest_with(counting, party=everywhere, alliance=[late]), draws, result)
    # On the run date the alliance does not exist yet: its members fail the threshold apart.
    on_date = before["seats"].isel(chain=0, draw=0, date=0)
    assert on_date.sel(party=["LAN", "HED"]).to_numpy().tolist() == [0, 0]
    xr.testing.assert_equal(before["seats_polling_day"], together["seats_polling_day"])


def test_regions_with_other_rules_count_as_they_would_alone() -> None:
    draws = made_up_draws(draws=30, dates=2)
    result = with_members(made_up_last_result(), 1)
    result.loc[result["region"] == "PORT", "seats"] = 5
    mixed = contest_with({"rule": "plurality", "where": [{"regions": ["PORT"], **DHONDT}]})
    seats = count(mixed, draws, result)
    assert seats.attrs["chamber"] == 16 + 40
    assert seats.attrs["counting_rule"] == "plurality; highest_averages"
    plurality = count(contest_with({"rule": "plurality"}), draws, result)
    lists = count(contest_with(DHONDT), draws, result)
    in_port = (seats["seat_region"] == "PORT").to_numpy()
    np.testing.assert_array_equal(seats["won"].isel(seat=~in_port), plurality["won"].isel(seat=~in_port))
    np.testing.assert_array_equal(seats["won"].isel(seat=in_port), lists["won"].isel(seat=in_port))


def test_nationwide_lists_need_no_seats_in_the_result() -> None:
    by_region = made_up_last_result().groupby("region", as_index=False).sum(numeric_only=True)
    by_region = by_region.assign(seat="", name="", seats=0, cluster="")
    contest = contest_with({**DHONDT, "across": "country", "seats": 90})
    seats = count(contest, made_up_draws(draws=20), by_region)
    assert (seats["seats_polling_day"].sum("party") == 90).all()
    assert "won" not in seats and "seat_chance" not in seats


def test_parallel_chamber_is_plurality_and_lists_side_by_side() -> None:
    draws, result = made_up_draws(draws=30, dates=2), with_members(made_up_last_result(), 1)
    local = count(contest_with({"rule": "plurality"}), draws, result)["seats"]
    both = count(contest_with({"rule": "mixed_parallel", "list_seats": 17}), draws, result)
    assert ((both["seats"] - local).sum("party") == 17).all()
    assert ((both["seats"] - local) >= 0).all()


def test_compensatory_chamber_is_in_proportion_where_nobody_wins_too_many() -> None:
    draws, result = made_up_draws(draws=60, dates=1), with_members(made_up_last_result(), 1)
    contest = contest_with({"rule": "mixed_compensatory", "list_seats": 200, "divisors": "sainte_lague"})
    seats = count(contest, draws, result)
    final = seats["seats_polling_day"].stack(sample=("chain", "draw"))
    share = draws["national_support_polling_day"].stack(sample=("chain", "draw")).sel(party=final["party"])
    listed = [p for p in final["party"].to_numpy() if p != "OTH"]
    votes = share.sel(party=listed) / share.sel(party=listed).sum("party")
    left = 224 - final.sel(party="OTH")
    # Sainte-Laguë rounds to the nearest seat, give or take one; the regions' own noise moves votes.
    gap = np.abs(final.sel(party=listed) - votes * left)
    assert float(gap.mean()) < 2.5


def test_shifted_votes_move_seats_the_way_they_should() -> None:
    contest = contest_with({"rule": "plurality"})
    draws, result = made_up_draws(draws=40, dates=1), with_members(made_up_last_result(), 1)
    prepared = prepare_seats(draws, last_result=result, contest=contest, rng=np.random.default_rng(3))
    fer = prepared.parties.index("FER")
    shifts = np.zeros((3, len(prepared.parties)))
    shifts[:, fer] = [-0.3, 0.0, 0.3]
    shifted = count_shifted(prepared, shifts=shifts, contest=contest)
    plain = count(contest, draws, result)["seats_polling_day"].sel(party=list(prepared.parties))
    np.testing.assert_array_equal(shifted["seats"].isel(shift=1), plain.to_numpy().reshape(-1, 5))
    assert (shifted["seats"].sel(party="FER").diff("shift") >= 0).all()
    assert (shifted["votes"].sel(party="FER").diff("shift") > 0).all()
    np.testing.assert_allclose(shifted["votes"].sum("party"), 1, atol=1e-6)


def test_a_count_that_ties_exactly_is_found_out_in_whole_votes() -> None:
    """100000, 80000, 30000, 20000 for eight seats, first divisor 1.4: 100000 / 7 = 20000 / 1.4."""
    result = pd.DataFrame(
        [["D1", "One", "PORT", 100000, 80000, 30000, 20000, 0, 8, ""]],
        columns=["seat", "name", "region", "FER", "LAN", "HED", "TID", "OTH", "seats", "cluster"],
    )
    contest = contest_with(
        {"rule": "highest_averages", "divisors": "modified_sainte_lague", "first_divisor": 1.4},
        region=[
            {"code": "PORT", "name": "Port", "counted": date(2033, 3, 1), "polling_day": date(2033, 2, 20)}
        ],
        party=[{"code": c, "name": c} for c in ("FER", "LAN", "HED", "TID")],
        alliance=[],
    )  # fmt: skip
    draws = made_up_draws(draws=400, chains=1, dates=1).sel(region=["PORT"])
    draws = draws.drop_vars("turnout_weight", errors="ignore")
    seats = count(contest, draws, result, counted_result=result)
    final = seats["seats_polling_day"].isel(chain=0)
    assert (seats["ties_broken"] >= 1).all()
    last_seat = final.sel(party="TID").to_numpy()
    assert set(last_seat) == {0, 1}
    assert abs(last_seat.mean() - 0.5) < 0.1
