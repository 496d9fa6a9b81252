"""The simulator against its own laws: what it prints, how it drifts, how far its polls stray."""

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scipy.stats import chi2

from data_demo.made_up_answers import draw_answers, expected_answers
from data_demo.made_up_country import draw_country, handed_on, softmax
from data_demo.made_up_election import (
    SMALL_ELECTION,
    ElectionSize,
    MadeUpElection,
    simulate_election,
    simulate_scenery,
)
from data_demo.made_up_leans import draw_house_truth
from data_demo.made_up_polls import draw_polls
from data_demo.made_up_scenery import OTHERS
from data_demo.made_up_schedule import draw_schedule
from data_demo.made_up_size import draw_scenery


@pytest.fixture(scope="module")
def election() -> MadeUpElection:
    return simulate_election(11)


def test_the_same_seed_gives_the_same_election_and_another_seed_another() -> None:
    first, again, other = (simulate_election(seed, size=SMALL_ELECTION) for seed in (4, 4, 5))
    for table, same in zip(first.truth.tables().values(), again.truth.tables().values(), strict=True):
        pd.testing.assert_frame_equal(table, same)
    pd.testing.assert_frame_equal(first.polls, again.polls)
    assert not first.result_last.equals(other.result_last)


def test_more_polls_leave_the_country_and_its_result_as_they_were() -> None:
    few = simulate_election(4, size=SMALL_ELECTION)
    many = simulate_election(4, size=replace(SMALL_ELECTION, polls=90))
    pd.testing.assert_frame_equal(few.outcome, many.outcome)
    pd.testing.assert_frame_equal(few.truth.support, many.truth.support)


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    seed=st.integers(0, 10_000),
    parties=st.integers(5, 7),
    regions=st.integers(2, 5),
    special_rows=st.booleans(),
)
def test_printed_shares_add_up_within_rounding_and_seats_to_the_chamber(
    seed: int, parties: int, regions: int, special_rows: bool
) -> None:
    size = replace(
        ElectionSize(), parties=parties, regions=regions, seats=20, polls=40, weeks=60, polled_weeks=50
    )
    election = simulate_election(seed, size=replace(size, special_rows=special_rows))
    assert election.truth.seats["seats"].sum() == 20
    codes = [*election.scenery.codes[:-1], "AL", OTHERS, "undecided"]
    printed = election.polls[codes].astype(float)
    grid = election.polls["house"].map({h.name: h.grid for h in election.scenery.houses})
    rounding = grid * printed.notna().sum(axis=1) / 2 + 1e-9
    total = printed.sum(axis=1)
    lists_others = printed[OTHERS].notna()
    assert ((total - 100).abs() <= rounding)[lists_others].all()
    assert (total <= 100 + rounding).all()
    support = election.truth.support.groupby(["date", "region"])["share"].sum()
    np.testing.assert_allclose(support, 100, atol=1e-9)


def test_outcome_and_truth_agree(election: MadeUpElection) -> None:
    codes = list(election.scenery.codes)
    day = election.truth.polling_day
    national = election.outcome[codes].sum() / election.outcome[codes].sum().sum() * 100
    stated = day[day["region"].eq("")].set_index("code")
    np.testing.assert_allclose(stated["votes"], national.loc[stated.index], rtol=1e-9)
    # Local noise of sd .15 in 200 seats moves the country by about .15 / sqrt(200) of a party's share.
    moved = np.log(stated["votes"] / stated["support"])
    assert moved.abs().max() < 5 * 0.2 / np.sqrt(200) + 0.02
    last_week = election.truth.support.query("region != ''")
    last_week = last_week[last_week["date"].eq(last_week["date"].max())]
    merged = last_week.merge(day, on=["region", "code"])
    np.testing.assert_allclose(merged["share"], merged["support"], atol=1e-9)


def test_a_party_gets_nothing_where_it_does_not_stand(election: MadeUpElection) -> None:
    absent = ~election.outcome["region"].isin(["R1", "R2"])
    assert (election.outcome.loc[absent, "PR"] == 0).all()
    assert (election.outcome.loc[~absent, "PR"] > 0).any()
    elsewhere = ~election.polls["region"].isin(["", "R1", "R2"])
    assert election.polls.loc[elsewhere, "PR"].isna().all()
    assert "PN" not in election.result_last


def test_an_heir_takes_its_share_and_others_what_is_left() -> None:
    scenery = draw_scenery(ElectionSize(), rng=np.random.default_rng(0))
    votes = pd.DataFrame({code: [100.0] for code in ("P1", "P2", "P3", "P4", "P5", "PR", "OLD", OTHERS)})
    after = handed_on(votes, scenery=scenery)
    assert after.loc[0, ["P5", OTHERS, "PN"]].tolist() == [180.0, pytest.approx(120.0), 0.0]
    assert after.sum(axis=1).tolist() == [800.0]


def test_no_house_is_in_the_field_twice_at_a_time(election: MadeUpElection) -> None:
    whole = election.polls.drop_duplicates("poll").sort_values(["house", "start"])
    overlap = whole["start"] <= whole.groupby("house")["end"].shift().fillna("")
    assert not overlap.any()
    assert (whole["published"] > whole["end"]).all()
    assert whole["published"].max() <= str(election.scenery.register_end)


def test_without_a_shared_lean_only_the_houses_common_mean_is_left() -> None:
    size = replace(SMALL_ELECTION, polls=40)
    off = simulate_election(3, size=size, shared_lean=False).truth
    common = off.houses.groupby("code", sort=False)["effect"].mean()
    for _, week in off.lean.groupby("date"):
        np.testing.assert_allclose(week.set_index("code")["log_points"], common.loc[week["code"]], atol=1e-12)


def test_weekly_drift_has_the_variance_it_was_drawn_with() -> None:
    """Weekly log-ratio moves of one region: sigma² of both parties, national and regional part."""
    size = replace(SMALL_ELECTION, regions=1, seats=1, weeks=4000, polled_weeks=20, parties=2)
    country = draw_country(
        draw_scenery(size, rng=np.random.default_rng(1)), shared_lean=True, rng=np.random.default_rng(2)
    )
    # A single region has no deviation from itself.
    path = country.log_support[::7, 0]
    moves = np.diff(path[:, 0] - path[:, 1])
    expected = country.sigma[0] ** 2 + country.sigma[1] ** 2
    statistic = float((moves**2).sum() / expected)
    assert chi2.ppf(0.0005, moves.size) < statistic < chi2.ppf(0.9995, moves.size)


def test_regional_deviations_move_half_as_far_as_the_country() -> None:
    size = replace(SMALL_ELECTION, regions=12, seats=12, weeks=2000, polled_weeks=20)
    country = draw_country(
        draw_scenery(size, rng=np.random.default_rng(1)), shared_lean=False, rng=np.random.default_rng(2)
    )
    path = country.log_support[::7] - country.log_support[::7].mean(axis=-1, keepdims=True)
    national = np.einsum("r,trp->tp", country.weights, path)
    deviation = path - national[:, None]
    weekly = np.diff(deviation, axis=0)
    national_weekly = np.diff(national, axis=0)
    keeps = 1 - 2 * country.weights + (country.weights**2).sum()
    ratio = (weekly**2).mean(axis=0) / keeps[:, None] / (national_weekly**2).mean(axis=0)
    assert ratio.mean() == pytest.approx(0.25, rel=0.05)


def test_the_shared_lean_has_the_record_sd_and_turns_by_a_third() -> None:
    scenery = draw_scenery(replace(SMALL_ELECTION, weeks=10, polled_weeks=8), rng=np.random.default_rng(0))
    scaled = []
    for seed in range(250):
        country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(seed))
        national = np.einsum("r,trp->tp", country.weights, country.lean[[0, 35, 70]])
        scaled.append(national / country.lean_scale)
    first, middle, last = np.moveaxis(np.array(scaled), 1, 0)
    for part in (first, middle, last):
        assert part.std() == pytest.approx(1, abs=0.07)
    assert (first * last).mean() == pytest.approx(1 / 3, abs=0.1)


def test_the_shared_lean_is_two_and_a_half_points_at_forty_percent_for_any_party_size() -> None:
    """Sd of a share is c sqrt(p (1 - p)) for every party and for every sum of parties.

    2.5 points is the sd behind a mean absolute shared error of 2 points (Shirani-Mehr et al. 2018, JASA 113).
    """
    scenery = draw_scenery(SMALL_ELECTION, rng=np.random.default_rng(0))
    country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(1))
    share = country.last_shares
    jacobian = np.diag(share) - np.outer(share, share)
    covariance = jacobian @ np.diag(country.lean_scale**2) @ jacobian.T
    scale = 0.025 / np.sqrt(0.4 * 0.6)
    np.testing.assert_allclose(np.sqrt(np.diag(covariance)), scale * np.sqrt(share * (1 - share)))
    two = share[:2].sum()
    assert np.sqrt(covariance[:2, :2].sum()) == pytest.approx(scale * np.sqrt(two * (1 - two)))


@pytest.mark.parametrize(("respondents", "deff"), [(300, 1.4), (1200, 2.5)])
def test_answers_stray_by_the_stated_design_effect(respondents: int, deff: float) -> None:
    rng = np.random.default_rng(5)
    expected = np.array([0.4, 0.35, 0.2, 0.05])
    groups = {"A": [0], "B": [1], "C": [2], OTHERS: [3]}
    cells = [
        draw_answers(expected, groups=groups, respondents=respondents, deff=deff, rng=rng)
        for _ in range(6000)
    ]
    shares = pd.DataFrame(cells) / respondents
    measured = shares.var() / (expected * (1 - expected) / respondents)
    # The sd of a variance from 6000 draws is sqrt(2 / 6000) = 1.8 %.
    np.testing.assert_allclose(measured, deff, rtol=0.08)
    np.testing.assert_allclose(shares.mean(), expected, atol=4 * np.sqrt(0.25 * deff / respondents / 6000))


def test_polls_of_a_whole_register_stray_from_what_they_should_say_by_their_design_effect() -> None:
    """Pearson statistic of every national poll about its expected answer, divided by its design effect."""
    size = replace(SMALL_ELECTION, polls=400, houses=12, weeks=110, polled_weeks=104)
    scenery = draw_scenery(size, rng=np.random.default_rng(8))
    fine = replace(scenery, houses=tuple(replace(h, grid=0.1, lists_others=True) for h in scenery.houses))
    country = draw_country(fine, shared_lean=True, rng=np.random.default_rng(9))
    rng = np.random.default_rng(11)
    schedule = draw_schedule(country, rng=rng)
    houses = draw_house_truth(country, schedule=schedule, rng=np.random.default_rng(10))
    polls = draw_polls(country, houses=houses, schedule=schedule, rng=rng).polls
    number = {h.name: k for k, h in enumerate(fine.houses)}
    statistics = []
    for row in polls.to_dict("records"):
        house = number[row["house"]]
        answers = expected_answers(
            country,
            effect=houses.effect[house],
            first_day=country.day_number(row["start"]),
            last_day=country.day_number(row["end"]),
        )
        expected = country.weights @ answers
        found = np.array([row[code] for code in fine.codes], dtype=float) / 100
        deff = houses.design_effect(house, respondents=row["sample"])
        statistics.append(((found - expected) ** 2 / expected).sum() * row["sample"] / deff)
    # Each is near a chi-square with parties - 1 degrees of freedom; rounding to .1 adds under 1 %.
    degrees = len(fine.codes) - 1
    assert np.mean(statistics) / degrees == pytest.approx(1, abs=4 * np.sqrt(2 / degrees / len(statistics)))


def test_seats_move_with_their_region_and_by_the_local_noise() -> None:
    size = replace(SMALL_ELECTION, regions=1, seats=600, parties=3)
    election = simulate_election(6, size=size)
    codes = list(election.scenery.codes)
    last = election.result_last[codes].to_numpy()
    now = election.outcome[codes].to_numpy()
    ratio = np.log(now / last)
    ratio -= ratio.mean(axis=0)
    scales = election.truth.parties.set_index("code")
    # The difference of two parties' moves: both slopes on their own last share, both noises.
    strength = np.log(last / last.sum(axis=1, keepdims=True))
    strength -= strength.mean(axis=0)
    slopes = scales.loc[codes, "seat_slope"].to_numpy()
    left = ratio - slopes * strength
    gap = left[:, 0] - left[:, 1]
    expected = np.hypot(*scales["local_sd"].iloc[:2])
    assert gap.std() == pytest.approx(expected, rel=0.2)


@pytest.mark.parametrize(
    ("size", "words"),
    [
        (replace(SMALL_ELECTION, parties=0), "parties"),
        (replace(SMALL_ELECTION, seats=2), "seats"),
        (replace(SMALL_ELECTION, polled_weeks=80), "polled_weeks"),
        (replace(SMALL_ELECTION, polls=3000), "fewer polls"),
        (replace(SMALL_ELECTION, formation_leans=True), "alliances"),
        (replace(SMALL_ELECTION, regions=1, phases=True), "two regions"),
        (replace(SMALL_ELECTION, polled_weeks=8, tracker=True), "tracker"),
    ],
)
def test_an_impossible_size_is_refused_with_its_reason(size: ElectionSize, words: str) -> None:
    with pytest.raises(ValueError, match=words):
        simulate_election(1, size=size)


def test_party_shares_do_not_depend_on_a_common_constant() -> None:
    log_weights = np.array([[0.3, -np.inf, 2.0]])
    np.testing.assert_allclose(softmax(log_weights), softmax(log_weights + 7.0))
    assert softmax(log_weights)[0, 1] == 0


def test_scenery_decides_the_names() -> None:
    scenery = draw_scenery(SMALL_ELECTION, rng=np.random.default_rng(0))
    election = simulate_scenery(replace(scenery, title="Named"), seed=1)
    assert election.scenery.title == "Named"
