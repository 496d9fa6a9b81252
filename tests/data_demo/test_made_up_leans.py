"""What makes a made-up house's figures differ: eras of its method, modes, populations, joint questions."""

from dataclasses import replace
from datetime import date

import numpy as np
import pandas as pd
import pytest

from data_demo.made_up_answers import expected_answers
from data_demo.made_up_country import Country, draw_country
from data_demo.made_up_election import SMALL_ELECTION, UNTIDY_ELECTION, MadeUpElection, simulate_election
from data_demo.made_up_leans import HouseTruth, draw_house_truth
from data_demo.made_up_polls import draw_polls
from data_demo.made_up_scenery import OTHERS, TARGET_POPULATION, MadeUpHouse, MethodChange
from data_demo.made_up_schedule import Visit, draw_schedule, mode_shares
from data_demo.made_up_size import draw_scenery

QUICK_UNTIDY = replace(UNTIDY_ELECTION, polls=80, weeks=30, polled_weeks=28, seats=16)


@pytest.fixture(scope="module")
def election() -> MadeUpElection:
    return simulate_election(5, size=UNTIDY_ELECTION)


@pytest.fixture(scope="module")
def drawn() -> list[tuple[Country, list[Visit], HouseTruth]]:
    scenery = draw_scenery(QUICK_UNTIDY, rng=np.random.default_rng(0))
    country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(1))
    found = []
    for seed in range(200):
        rng = np.random.default_rng([3, seed])
        schedule = draw_schedule(country, rng=rng)
        found.append((country, schedule, draw_house_truth(country, schedule=schedule, rng=rng)))
    return found


def test_mode_leans_have_mean_zero_over_houses_and_seven_tenths_of_the_house_scale(
    drawn: list[tuple[Country, list[Visit], HouseTruth]],
) -> None:
    scaled, expected = [], []
    for _, schedule, houses in drawn:
        shares = mode_shares(schedule)
        weights = np.array(list(shares.values()))
        leans = np.array([houses.mode_lean[mode] for mode in shares])
        np.testing.assert_allclose(weights @ leans, 0, atol=1e-12)
        scaled.append(((leans / houses.effect_scale) ** 2).mean(axis=1))
        # Taking the weighted mean away leaves this much of each mode's variance.
        expected.append(0.49 * (1 - 2 * weights + (weights**2).sum()))
    assert np.concatenate(scaled).mean() == pytest.approx(np.concatenate(expected).mean(), rel=0.08)


def test_a_house_of_two_modes_counts_for_each_by_its_share_of_polls() -> None:
    visits = [Visit(0, d, d, d, mode="online") for d in range(3)] + [Visit(0, 9, 9, 9, mode="telephone")]
    visits += [Visit(1, 0, 0, 0, mode="telephone")]
    assert mode_shares(visits) == {"online": 0.375, "telephone": 0.625}


def test_eras_of_a_house_sum_to_zero_and_shift_by_half_the_house_scale(
    drawn: list[tuple[Country, list[Visit], HouseTruth]],
) -> None:
    scaled = []
    for country, _, houses in drawn:
        for house, effect in zip(country.scenery.houses, houses.era_effect, strict=True):
            assert effect.shape[0] == len(house.methods)
            np.testing.assert_allclose(effect.sum(axis=0), 0, atol=1e-12)
            if len(effect) == 2:
                scaled.append(((effect[1] - effect[0]) / houses.effect_scale) ** 2)
    # Two draws of sd 1/2, apart.
    assert np.mean(scaled) == pytest.approx(2 * 0.25, rel=0.08)


def test_population_and_formation_leans_are_seven_tenths_of_the_house_scale_and_the_target_has_none(
    drawn: list[tuple[Country, list[Visit], HouseTruth]],
) -> None:
    for kind in ("population_lean", "formation_lean"):
        scaled = [
            (lean / houses.effect_scale) ** 2
            for _, _, houses in drawn
            for lean in getattr(houses, kind).values()
        ]
        assert np.mean(scaled) == pytest.approx(0.49, rel=0.1), kind
    assert all(TARGET_POPULATION not in houses.population_lean for _, _, houses in drawn)


def test_a_poll_carries_the_sum_of_its_terms() -> None:
    one, scale = np.array([0.1, -0.2]), np.array([0.1, 0.1])
    houses = HouseTruth(
        effect=np.array([one]),
        effect_scale=scale,
        kappa=np.array([1.4]),
        rho=np.array([0.0004]),
        era_effect=(np.array([[0.01, 0.02], [-0.01, -0.02]]),),
        mode_lean={"online": np.array([0.2, 0.0])},
        population_lean={"adults": np.array([0.0, 0.3])},
        formation_lean={"AL": np.array([0.4, 0.4]), "BL": np.array([0.05, 0.0])},
    )
    whole = houses.whole_effect(0, era=1, mode="online", population="adults", together=["AL", "BL"])
    np.testing.assert_allclose(whole, [0.1 - 0.01 + 0.2 + 0.45, -0.2 - 0.02 + 0.3 + 0.4])
    plain = houses.whole_effect(0, era=0, mode="mixed", population=TARGET_POPULATION)
    np.testing.assert_allclose(plain, [0.1 + 0.01, -0.2 + 0.02])


def test_a_house_works_by_its_new_method_from_the_day_of_change() -> None:
    changes = (MethodChange(date(2030, 2, 1), "panel", mode="online"), MethodChange(date(2030, 5, 1), "both"))
    house = MadeUpHouse("Anyone", "ANY", "telephone", method="calls", changes=changes)
    assert house.methods == ("calls", "panel", "both")
    assert [house.era_on(date(2030, m, d)) for m, d in ((1, 31), (2, 1), (4, 30), (5, 1))] == [0, 1, 1, 2]
    assert [house.main_mode(era) for era in range(3)] == ["telephone", "online", "online"]


def test_the_register_shows_the_new_label_from_the_day_of_change(election: MadeUpElection) -> None:
    changed = [h for h in election.scenery.houses if h.changes]
    assert len(changed) >= 3
    for house in changed:
        rows = election.polls[election.polls["house"] == house.name]
        later = rows["start"] >= str(house.changes[0].day)
        assert later.any() and not later.all()
        assert (rows.loc[later, "method"] == house.methods[1]).all()
        assert (rows.loc[~later, "method"] == house.methods[0]).all()


def test_the_truth_gives_each_era_its_own_lean_and_leans_without_the_mode(election: MadeUpElection) -> None:
    houses = election.truth.houses
    assert not houses.duplicated(["house", "method", "code"]).any()
    eras = houses.groupby("house")["method"].nunique()
    assert eras.to_dict() == {h.name: len(h.methods) for h in election.scenery.houses}
    sums = houses.groupby(["house", "method"])[["lean_points", "own_lean_points"]].sum()
    np.testing.assert_allclose(sums, 0, atol=1e-9)
    assert not np.allclose(houses["lean_points"], houses["own_lean_points"])


def test_the_truth_lists_leans_in_points_with_an_alliances_total(election: MadeUpElection) -> None:
    leans = election.truth.leans
    parties = leans[leans["log_points"].notna()]
    np.testing.assert_allclose(parties.groupby(["kind", "label"])["points"].sum(), 0, atol=1e-9)
    assert set(leans["kind"]) == {"mode", "population", "asked_together"}
    alliance = election.scenery.alliances[0]
    together = leans[leans["label"] == alliance.code].set_index("code")["points"]
    assert together[alliance.code] == pytest.approx(together[list(alliance.members)].sum())


def test_figures_of_a_joint_question_differ_by_the_formation_lean() -> None:
    """Over elections, pooled rows minus the members' sum in rows of the same house: the stated lean."""
    gaps, leans = [], []
    size = replace(
        SMALL_ELECTION,
        parties=4,
        houses=4,
        polls=160,
        alliances=True,
        special_rows=True,
        formation_leans=True,
    )
    for seed in range(12):
        election = simulate_election(seed, size=size)
        pools = next(h for h in election.scenery.houses if h.pools)
        alliance = election.scenery.alliances[0]
        rows = election.polls[(election.polls["house"] == pools.name) & (election.polls["region"] == "")]
        rows = rows[rows["start"] >= str(alliance.from_)]
        base = 1 - rows["undecided"].fillna(0).astype(float) / 100
        pooled = (rows["AL"].astype(float) / base).mean()
        named = (rows[list(alliance.members)].astype(float).sum(axis=1, min_count=2) / base).mean()
        if np.isnan(pooled) or np.isnan(named):
            continue
        gaps.append(pooled - named)
        table = election.truth.leans
        leans.append(table.loc[table["code"] == alliance.code, "points"].item())
    # Drift between the rows and sampling leave a point or so.
    assert np.corrcoef(gaps, leans)[0, 1] > 0.5
    assert np.polyfit(leans, gaps, 1)[0] == pytest.approx(1, abs=0.6)


def test_rows_of_an_untidy_register_stray_from_what_their_terms_say_by_their_design_effect() -> None:
    """Pearson statistic of each national row, over its cells; without the added terms it is too large."""
    scenery = draw_scenery(replace(UNTIDY_ELECTION, polls=400), rng=np.random.default_rng(8))
    fine = replace(scenery, houses=tuple(replace(h, grid=0.1) for h in scenery.houses))
    country = draw_country(fine, shared_lean=True, rng=np.random.default_rng(9))
    rng = np.random.default_rng(10)
    schedule = draw_schedule(country, rng=rng)
    houses = draw_house_truth(country, schedule=schedule, rng=np.random.default_rng(11))
    polls = draw_polls(country, houses=houses, schedule=schedule, rng=rng).polls
    bare = replace(houses, mode_lean={}, population_lean={}, formation_lean={})
    rows = polls[polls["region"].eq("") & ~polls["poll"].str.contains("-T")]
    assert len(rows) > 250

    def ratio(terms: HouseTruth) -> tuple[float, int]:
        found = [_pearson(row, country=country, houses=terms) for row in rows.to_dict("records")]
        statistics, degrees = np.array(found).T
        return float(statistics.sum() / degrees.sum()), int(degrees.sum())

    stray, degrees = ratio(houses)
    assert stray == pytest.approx(1, abs=4 * np.sqrt(2 / degrees))
    assert ratio(bare)[0] > 1 + 8 * np.sqrt(2 / degrees)


def _pearson(row: dict, *, country: Country, houses: HouseTruth) -> tuple[float, int]:
    """Squared distance of a row's cells from what is expected, over design effect; and its degrees."""
    scenery = country.scenery
    position = [h.name for h in scenery.houses].index(row["house"])
    house = scenery.houses[position]
    members = {code: [j] for j, code in enumerate(scenery.codes)}
    members |= {a.code: [scenery.codes.index(m) for m in a.members] for a in scenery.alliances}
    cells = {code: members[code] for code in members if code != OTHERS and not pd.isna(row[code])}
    together = [a.code for a in scenery.alliances if a.code in cells]
    effect = houses.whole_effect(
        position,
        era=house.era_on(date.fromisoformat(row["start"])),
        mode=row["mode"],
        population=row["population"],
        together=together,
    )
    first, last = country.day_number(row["start"]), country.day_number(row["end"])
    expected_by_party = country.weights @ expected_answers(
        country, effect=effect, first_day=first, last_day=last
    )
    expected = np.array([expected_by_party[m].sum() for m in cells.values()])
    decided = 1 - (0.0 if pd.isna(row["undecided"]) else row["undecided"]) / 100
    found = np.array([row[code] for code in cells], dtype=float) / 100 / decided
    expected, found = np.append(expected, 1 - expected.sum()), np.append(found, 1 - found.sum())
    size = row["sample"] * decided
    deff = houses.design_effect(position, respondents=size)
    return float(((found - expected) ** 2 / expected).sum() * size / deff), len(expected) - 1


def test_switching_a_lean_on_leaves_houses_country_and_result_as_they_were() -> None:
    plain = simulate_election(4, size=SMALL_ELECTION)
    for switch in ("mode_leans", "population_leans", "method_changes"):
        other = simulate_election(4, size=replace(SMALL_ELECTION, **{switch: True}))
        pd.testing.assert_frame_equal(plain.outcome, other.outcome)
        pd.testing.assert_frame_equal(plain.truth.design, other.truth.design)
        assert not plain.polls.drop(columns=["method"]).equals(other.polls.drop(columns=["method"]))


def test_an_effective_size_is_the_sample_over_what_weighting_costs(election: MadeUpElection) -> None:
    kappa = election.truth.design.set_index("house")["kappa"]
    given = election.polls[election.polls["effective"].notna()]
    says = {h.name for h in election.scenery.houses if h.gives_effective}
    assert set(given["house"]) == says
    ratio = given["sample"] / given["effective"].astype(float)
    np.testing.assert_allclose(ratio, kappa.loc[given["house"]], rtol=0.02)
    assert (ratio > 1).all()


def test_a_part_breakdown_prints_the_nation_and_some_regions(election: MadeUpElection) -> None:
    house = next(h for h in election.scenery.houses if h.breakdown_regions)
    assert house.breakdown_regions is not None
    rows = election.polls[election.polls["house"] == house.name]
    many = rows[rows["poll"].duplicated(keep=False)]
    assert many["poll"].nunique() >= 2
    for _, poll in many.groupby("poll"):
        assert set(poll["region"]) == {"", *house.breakdown_regions}
        national = poll.loc[poll["region"] == "", "sample"].item()
        assert poll.loc[poll["region"] != "", "sample"].sum() < national
