"""Each violation does to voters and register what it says, and nothing else."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pandas as pd
import pytest

from data_demo.all_violations import VIOLATIONS
from data_demo.made_up_country import draw_country, softmax
from data_demo.made_up_election import (
    SMALL_ELECTION,
    UNTIDY_ELECTION,
    ElectionSize,
    MadeUpElection,
    simulate_election,
)
from data_demo.made_up_false_house import FalseHouse
from data_demo.made_up_field_mean import field_mean, members_of, offered_shares, recent_polls
from data_demo.made_up_herding import Herding
from data_demo.made_up_late_swing import LateSwing
from data_demo.made_up_refusals import PartisanRefusals
from data_demo.made_up_size import draw_scenery
from data_demo.made_up_understated_noise import UnderstatedNoise
from data_demo.made_up_violation import Violation

SIZE = replace(SMALL_ELECTION, polls=80)
SMALL_UNTIDY = replace(UNTIDY_ELECTION, parties=6, regions=4, seats=12, polls=70, weeks=40, polled_weeks=38)


def simulate(violation: Violation | None, *, seed: int = 5, size: ElectionSize = SIZE) -> MadeUpElection:
    return simulate_election(seed, size=size, violation=violation)


@pytest.mark.parametrize("name", VIOLATIONS)
def test_an_election_with_a_violation_is_the_pair_of_the_one_without(name: str) -> None:
    honest, violated = simulate(None), simulate(VIOLATIONS[name])
    pd.testing.assert_frame_equal(honest.result_last, violated.result_last)
    assert VIOLATIONS[name].name == name and VIOLATIONS[name].what.endswith(".")
    same_voters = honest.truth.polling_day.equals(violated.truth.polling_day)
    same_polls = honest.polls.equals(violated.polls)
    assert (same_voters, same_polls) == ((False, True) if name == "late_swing" else (True, False))


@pytest.mark.parametrize("name", VIOLATIONS)
def test_a_violated_register_of_an_untidy_election_still_adds_up(name: str) -> None:
    election = simulate(VIOLATIONS[name], size=SMALL_UNTIDY)
    scenery = election.scenery
    grid = election.polls["house"].map({h.name: h.grid for h in scenery.houses}).fillna(0.1)
    codes = [*scenery.codes[:-1], *(a.code for a in scenery.alliances), "OTH", "undecided"]
    printed = election.polls[codes].astype(float)
    rounding = grid * printed.notna().sum(axis=1) / 2 + 1e-9
    whole = printed["OTH"].notna()
    assert ((printed.sum(axis=1) - 100).abs() <= rounding)[whole].all()
    assert (printed.sum(axis=1) <= 100 + rounding).all()
    assert election.polls["published"].max() <= str(scenery.register_end)


def test_a_late_swing_comes_after_the_last_poll_and_within_the_last_week() -> None:
    scenery = draw_scenery(replace(SMALL_UNTIDY, silent_days=20), rng=np.random.default_rng(0))
    country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(1))
    for seed in range(20):
        moved = LateSwing().change_country(country, rng=np.random.default_rng(seed))
        changed = np.flatnonzero((moved.log_support != country.log_support).any(axis=(1, 2)))
        assert country.day_number(scenery.polling_day) - 7 < changed[0]
        assert changed[-1] == country.day_number(scenery.polling_day)
        # The last region voted two weeks before.
        np.testing.assert_array_equal(moved.log_support[:, -1], country.log_support[:, -1])
        np.testing.assert_allclose(np.exp(moved.log_support).sum(axis=-1), 1)


def test_a_late_swing_is_three_points_at_forty_percent() -> None:
    scenery = draw_scenery(replace(SIZE, regions=1, seats=1), rng=np.random.default_rng(0))
    country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(1))
    before = np.exp(country.log_support[-1, 0])
    moves = [
        np.exp(LateSwing().change_country(country, rng=np.random.default_rng(s)).log_support[-1, 0]) - before
        for s in range(400)
    ]
    # The law holds at the last result; support has drifted from it a little.
    size = 0.03 / np.sqrt(0.24) * np.sqrt(before * (1 - before))
    np.testing.assert_allclose(np.std(moves, axis=0), size, rtol=0.25)


def test_a_herd_prints_half_its_own_figure_and_half_the_others_mean() -> None:
    honest, herd = simulate(None), simulate(Herding())
    scenery, codes = honest.scenery, list(honest.scenery.codes)
    own, printed = honest.polls.to_dict("records"), herd.polls.to_dict("records")
    last = np.zeros(len(codes))
    pulled = 0
    for before, after in zip(own, printed, strict=True):
        day = date.fromisoformat(before["published"])
        others = recent_polls(printed, day=day, house=before["house"])
        if len(others) < 3:
            assert [after[c] for c in codes[:-1]] == [before[c] for c in codes[:-1]]
            continue
        target = 100 * field_mean(others, scenery=scenery, last_shares=last)
        mine = offered_shares(before, scenery=scenery)
        grid = next(h.grid for h in scenery.houses if h.name == before["house"])
        half = {c: (mine[c] + target[k]) / 2 for k, c in enumerate(codes)}
        scale = 100 / sum(half.values())
        assert all(abs(after[c] - scale * half[c]) <= grid / 2 + 1e-6 for c in codes[:-1])
        pulled += 1
    assert pulled > 40
    # Half the distance from the field is left.
    spread = [frame[codes[:-1]].astype(float).diff().std().mean() for frame in (honest.polls, herd.polls)]
    assert spread[1] < 0.75 * spread[0]


def test_a_figure_of_an_alliance_and_what_others_take_in_are_known() -> None:
    scenery = draw_scenery(SMALL_UNTIDY, rng=np.random.default_rng(0))
    row = {"AL": 50.0, "P2": 30.0, "undecided": 20.0}
    shares = offered_shares(row, scenery=scenery)
    assert shares == {"AL": 62.5, "P2": 37.5, "OTH": 0.0}
    assert members_of("AL", offered=shares, scenery=scenery) == [0, 2]
    others = members_of("OTH", offered=shares, scenery=scenery)
    assert sorted([0, 1, 2, *others]) == list(range(len(scenery.codes)))


def test_a_false_house_stays_near_the_field_and_claims_large_samples() -> None:
    size = replace(SMALL_ELECTION, polls=200, houses=8)
    honest, violated = simulate(None, size=size), simulate(FalseHouse(), size=size)
    false = violated.polls["house"].eq("House Zero")
    pd.testing.assert_frame_equal(
        violated.polls[~false].reset_index(drop=True), honest.polls, check_dtype=False
    )
    added = violated.polls[false]
    assert len(added) >= 25
    assert added["sample"].between(3600, 4400).all()
    assert (pd.to_datetime(added["end"]).diff().dropna().dt.days == 7).all()
    assert "House Zero" not in set(violated.truth.houses["house"])


def test_a_false_house_wanders_about_a_point_from_the_field() -> None:
    """The sd of its distance at any time, in units of what it says, over parties, weeks and elections."""
    size = replace(SMALL_ELECTION, polls=150, houses=6, regions=1, seats=1)
    away = []
    for seed in range(8):
        election = simulate(FalseHouse(), seed=seed, size=size)
        scenery, rows = election.scenery, election.polls.to_dict("records")
        shares = election.truth.parties["last_share"].to_numpy() / 100
        for row in rows:
            if row["house"] == "House Zero":
                field = recent_polls(rows, day=date.fromisoformat(row["end"]), house="House Zero")
                mean = field_mean(field, scenery=scenery, last_shares=shares)
                distance = np.log([row[code] / 100 for code in scenery.codes]) - np.log(mean)
                away.append(distance / (0.08 * np.sqrt(0.15 / shares)))
    # What all parties' distances have in common is lost when shares are made to sum to one.
    assert 0.75 < np.sqrt(np.mean(np.square(away))) < 1.2


def test_houses_that_understate_their_noise_claim_a_third_of_their_variance() -> None:
    honest, violated = simulate(None), simulate(UnderstatedNoise())
    pd.testing.assert_frame_equal(honest.polls[["house", "end"]], violated.polls[["house", "end"]])
    design, said = violated.truth.design.set_index("house"), honest.truth.design.set_index("house")
    np.testing.assert_allclose(design["design_effect"], 3 * said["design_effect"])
    claimed = violated.polls["sample"] / violated.polls["effective"].astype(float)
    usual = violated.polls["house"].map(said["kappa"])
    np.testing.assert_allclose(claimed, usual, rtol=0.01)


def test_refusals_take_a_fifth_of_one_partys_voters_from_every_poll_and_none_at_the_last_election() -> None:
    scenery = draw_scenery(SIZE, rng=np.random.default_rng(0))
    country = draw_country(scenery, shared_lean=False, rng=np.random.default_rng(1))
    refused = PartisanRefusals().change_country(country, rng=np.random.default_rng(2))
    np.testing.assert_array_equal(refused.log_support, country.log_support)
    np.testing.assert_array_equal(refused.lean[0], country.lean[0])
    true = np.exp(country.log_support[40, 0])
    answered = softmax(country.log_support[40, 0] + refused.lean[40, 0])
    answering = answered / true / (answered / true).max()
    assert sorted(answering.round(6)) == pytest.approx([0.7 / 0.85, 1, 1, 1, 1])


def test_a_restless_country_moves_as_many_times_faster_as_it_is_told() -> None:
    calm, restless = (simulate(None, size=replace(SIZE, drift=drift)).truth.parties for drift in (1.0, 3.0))
    np.testing.assert_allclose(restless["sigma"], 3 * calm["sigma"])


def test_silent_days_end_the_register_earlier() -> None:
    election = simulate(None, size=replace(SMALL_UNTIDY, silent_days=25))
    assert election.scenery.register_end == date(2030, 5, 8)
    assert election.polls["published"].max() <= "2030-05-08"
    shares = election.truth.at_register_end.groupby("region")["support"].sum()
    np.testing.assert_allclose(shares, 100)
    with pytest.raises(ValueError, match="silent_days"):
        simulate(None, size=replace(SIZE, silent_days=300))
