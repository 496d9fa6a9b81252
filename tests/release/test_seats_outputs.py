"""What a release says of majorities: together, seat by seat, against votes, and in a chamber that grows."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.inputs.contest import CountingRule
from aggregator.inputs.counting_terms import Across, Counting, CountingWhere
from aggregator.release.chamber import describe_chamber
from aggregator.release.chances_table import build_chances_table
from aggregator.release.charts import build_charts
from aggregator.release.codes import contest_codes
from aggregator.release.combinations_table import build_combinations_table
from aggregator.release.counting_words import describe_counting
from aggregator.release.deciding_seats_table import build_deciding_seats_table
from aggregator.release.draws_file import build_draws_tree
from aggregator.release.headlines import build_headlines
from aggregator.release.seats_page_tables import (
    closest_seats_table,
    combinations_table,
    deciding_seats_table,
    districts_table,
    equal_votes_sentences,
    seats_table,
    seats_votes_table,
)
from aggregator.release.seats_rows import share_for_majority
from aggregator.release.seats_tables import build_seat_chances_table
from aggregator.release.seats_votes_table import build_seats_votes_table
from aggregator.release.table_words import Kind, SeatsVotes
from aggregator.release.write_release import build_contents
from aggregator.seats.majorities import Outcome
from tests.made_up_draws import made_up_contest, made_up_draws
from tests.release.made_up_desk import made_up_run, made_up_seats, made_up_shifted, with_overhang

ROWS = ("won", "seat_votes", "seat_chance", "seat_expected", "seat_share", "last_share")


def seats_by_hand(*draws: tuple[int, int, int]) -> xr.Dataset:
    """A chamber of ten on one date and polling day: seats of FER, LAN and HED in each draw of one chain."""
    run = made_up_draws(chains=1, draws=len(draws), dates=1)
    won = xr.DataArray(
        np.array([[(*draw, 0, 10 - min(sum(draw), 10)) for draw in draws]], dtype=np.int16),
        dims=("chain", "draw", "party"),
        coords={"party": ["FER", "LAN", "HED", "TID", "OTH"]},
    )
    dated = won.expand_dims(date=run["date"].values, axis=2)
    return xr.Dataset({"seats": dated, "seats_polling_day": won}, attrs={"chamber": 10})


@pytest.fixture(scope="module")
def run(tmp_path_factory):
    return made_up_run(tmp_path_factory.mktemp("contest"), draws=100)


def contents_of(run, **changes):
    arguments = {**run, **changes}
    return build_contents(arguments.pop("inputs"), **arguments)


@pytest.fixture(scope="module")
def contents(run):
    return contents_of(run)


def test_combinations_are_counted_by_hand_and_an_alliance_of_the_day_is_named():
    # Majority 6 of 10: FER alone; twice the pact or any pair; FER with either, and the pact falls short.
    table = build_combinations_table(
        seats_by_hand((6, 2, 2), (3, 4, 3), (4, 3, 3), (5, 2, 3)), contest=made_up_contest()
    )
    final = table[table["kind"] == Kind.ON_POLLING_DAY].set_index("combination")
    assert set(final.index) == {"FER", "FER+LAN", "FER+HED", "LAN+HED"}
    assert final.loc["FER+LAN", "chance"] == pytest.approx(4.5 / 5)  # (k + 1/2) / (S + 1) for all four
    assert final.loc["FER+LAN", "chance_minimal"] == pytest.approx(3.5 / 5)
    assert final.loc["LAN+HED", "chance"] == pytest.approx(2.5 / 5)
    assert final.loc["FER", ["mean", "q05", "q95"]].tolist() == [4.5, 3, 6]
    assert final["alliance"].to_dict() == {"FER": "", "FER+LAN": "", "FER+HED": "", "LAN+HED": "GLOW"}
    assert final["parties"].to_dict() == {"FER": 1, "FER+LAN": 2, "FER+HED": 2, "LAN+HED": 2}


def test_a_single_party_and_an_alliance_have_the_chance_that_chances_gives_them(run, contents):
    tables = contents.tables
    alone = tables.chances[
        (tables.chances["outcome"] == Outcome.MAJORITY_ALONE)
        & (tables.chances["kind"] == Kind.ON_POLLING_DAY)
    ].set_index("code")["probability"]
    final = tables.combinations[tables.combinations["kind"] == Kind.ON_POLLING_DAY]
    singles = final[final["parties"] == 1].set_index("combination")["chance"]
    assert len(singles)
    for code, chance in singles.items():
        assert chance == alone[code]


def test_an_alliance_that_has_ended_is_not_named():
    contest = made_up_contest()
    ended = contest.alliances[0].model_copy(update={"until": contest.polling_day.replace(day=14)})
    contest = contest.model_copy(update={"alliances": (ended,)})
    table = build_combinations_table(seats_by_hand((3, 4, 3), (3, 3, 4)), contest=contest)
    pact = table[table["combination"] == "LAN+HED"].set_index("kind")["alliance"]
    assert pact.to_dict() == {Kind.ON_DATE: "GLOW", Kind.ON_POLLING_DAY: ""}


def test_a_majority_is_counted_with_the_line_of_each_draw_in_a_chamber_that_grows():
    # With two overhang seats 6 of 12 is no majority, though it is one of 10.
    seats = seats_by_hand((6, 2, 2), (6, 4, 2), (6, 1, 3))
    contest = made_up_contest()
    draws = made_up_draws(chains=1, draws=3, dates=1)
    chances = build_chances_table(draws, seats=seats, contest=contest)
    alone = chances[(chances["outcome"] == Outcome.MAJORITY_ALONE) & (chances["code"] == "FER")]
    assert alone["probability"].tolist() == pytest.approx([2.5 / 4, 2.5 / 4], abs=1e-4)
    chamber = describe_chamber(seats, contest=contest)
    assert (chamber.regular, chamber.majority, chamber.size, chamber.line) == (10, 6, (10, 12), (6, 7))
    assert chamber.sentence == (
        "The chamber has 10 regular seats; with overhang seats it has 10 to 12 (90 % interval), and a "
        "majority is 6 of the regular seats, and 6 to 7 with overhang."
    )


def test_a_chamber_of_one_size_says_its_majority_in_one_number():
    chamber = describe_chamber(seats_by_hand((6, 2, 2), (5, 3, 2)), contest=made_up_contest())
    assert chamber.sentence == "A majority is 6 of 10."
    assert (chamber.grows, chamber.line_moves, chamber.line_text) == (False, False, "majority: 6 of 10")


def test_overhang_leaves_a_majority_that_the_contest_states():
    contest = made_up_contest().model_copy(update={"counting": Counting(majority=7)})
    chamber = describe_chamber(seats_by_hand((6, 2, 2), (6, 4, 2)), contest=contest)
    assert (chamber.grows, chamber.line_moves, chamber.middle_line) == (True, False, 7)
    assert "a majority stays 7" in chamber.sentence


def test_page_note_and_headline_of_a_chamber_that_grows_state_the_regular_number(run):
    seats = with_overhang(run["seats"])
    contents = contents_of(run, seats=seats)
    told = contents.headlines.seats
    assert "of the regular 24" in told
    assert "a majority (13 of the regular 24, and more with overhang seats)" in told
    table = seats_table(contents)
    assert table.header[-1] == "Of these from lists, on polling day"
    assert table.caption.startswith("Seats. The chamber has 24 regular seats; with overhang seats it has")
    assert seats_votes_table(contents).header == ("", "Votes", "Seats a point")  # no line to be needed for
    lists = {row[0]: row[-1] for row in table.rows}
    mean = float(seats["list_seats_polling_day"].sel(party="HED").mean())
    assert (lists["Ferry Party"], lists["Glow Pact"]) == ("0", f"{mean:.0f}")
    for chart in build_charts(contents):
        if "seats" in chart.name or chart.name == "combinations":
            assert "24 regular seats" in chart.alt_text or chart.name == "deciding_seats"


def test_without_an_alliance_the_headline_names_the_fewest_parties_that_reach_the_line(run, contents):
    contest = contents.contest.model_copy(update={"alliances": ()})
    chances = contents.tables.chances.copy()
    alone = chances["outcome"] == Outcome.MAJORITY_ALONE
    chances.loc[alone, ["probability", "likelihood"]] = [0.004, "exceptionally unlikely"]
    kept = chances["outcome"] != Outcome.MAJORITY_ONLY_AS_ALLIANCE
    combinations = build_combinations_table(
        seats_by_hand(*[(4, 4, 2)] * 9, (4, 2, 4)), contest=made_up_contest()
    )
    tables = replace(contents.tables, chances=chances[kept], combinations=combinations)
    told = build_headlines(tables, contest=contest, chamber=contents.chamber).seats
    assert told.endswith(
        "to reach a majority of 13; of two parties together, Ferry Party and Lantern Union are the likeliest "
        "to: very likely (95 %)."
    )


def test_where_a_party_is_likely_to_have_a_majority_the_headline_names_no_combination(run, contents):
    contest = contents.contest.model_copy(update={"alliances": ()})
    chances = contents.tables.chances
    chances = chances[chances["outcome"] != Outcome.MAJORITY_ONLY_AS_ALLIANCE]
    told = build_headlines(
        replace(contents.tables, chances=chances), contest=contest, chamber=contents.chamber
    ).seats
    assert "together" not in told


def test_every_seat_of_one_member_has_a_row_for_every_code_near_a_majority(contents):
    table = contents.tables.deciding_seats
    assert set(table["code"]) == {"FER", "GLOW"}
    assert table.groupby("code")["decides"].sum().to_dict() == pytest.approx({"FER": 1, "GLOW": 1}, abs=0.002)
    assert table.groupby("code")["carries"].sum().to_dict() == pytest.approx(
        {"FER": 100, "GLOW": 100}, abs=0.2
    )
    chances = contents.tables.seat_chances.set_index(["seat", "code"])["chance"]
    fer = table[table["code"] == "FER"].set_index("seat")["chance"]
    assert fer.to_dict() == {seat: chances[seat, "FER"] for seat in fer.index}
    surest = contents.tables.seat_chances.groupby("seat")["chance"].max()
    assert set(table.loc[table["too_close"] == "yes", "seat"]) == set(surest[surest < 0.66].index)


def test_counted_seats_decide_nothing_and_count_as_held(run):
    seats, contest = run["seats"], made_up_contest()
    counted = pd.DataFrame({"seat": seats["seat"].values[:8]})
    table = build_deciding_seats_table(
        seats, contest=contest, codes=contest_codes(contest), counted_result=counted
    )
    assert not set(table["seat"]) & set(counted["seat"])
    assert (table.groupby("code")["decides"].sum() <= 1 + 1e-9).all()


def test_seats_that_list_seats_make_up_for_decide_nothing(run):
    contest = made_up_contest()
    where = CountingWhere(rule=CountingRule.MIXED_COMPENSATORY, regions=("PORT",), list_seats=5)
    mixed = contest.model_copy(update={"counting": Counting(where=(where,))})
    table = build_deciding_seats_table(run["seats"], contest=mixed, codes=contest_codes(contest))
    assert "PORT" not in set(table["region"])
    whole = Counting(rule=CountingRule.MIXED_COMPENSATORY, list_seats=5)
    everywhere = contest.model_copy(update={"counting": whole})
    assert build_deciding_seats_table(run["seats"], contest=everywhere, codes=contest_codes(contest)) is None


def test_where_lists_fill_all_seats_there_is_nothing_seat_by_seat_and_all_else(run):
    lists = run["seats"].drop_vars(ROWS).drop_dims("seat")
    contents = contents_of(run, seats=lists)
    assert contents.tables.seat_chances is None
    assert contents.tables.deciding_seats is None
    assert len(contents.tables.combinations)
    names = {chart.name for chart in build_charts(contents)}
    assert "combinations" in names
    assert "deciding_seats" not in names
    for table in (deciding_seats_table, closest_seats_table, districts_table):
        assert table(contents) is None


def test_districts_of_several_members_have_their_members_and_no_winner(run):
    seats = made_up_seats(run["draws"])
    magnitude = np.where(np.arange(24) < 4, 3, 1)
    seats = seats.assign_coords(seat_magnitude=("seat", magnitude))
    seats["seat_expected"] = seats["seat_expected"] * seats["seat_magnitude"]
    table = build_seat_chances_table(seats)
    assert table.groupby("seat", sort=False)["members"].first().tolist() == magnitude.tolist()
    sums = table.groupby("seat", sort=False)["expected_members"].sum()
    assert sums.tolist() == pytest.approx(magnitude.tolist(), abs=1e-9)
    contents = contents_of(run, seats=seats)
    assert len(districts_table(contents).rows) == 4
    assert "of 20 seats" in closest_seats_table(contents).caption
    assert not set(contents.tables.deciding_seats["seat"]) & set(seats["seat"].values[:4])


def test_expected_members_sum_to_the_mean_of_the_seats(contents):
    final = contents.tables.seats[contents.tables.seats["kind"] == Kind.ON_POLLING_DAY]
    expected = contents.tables.seat_chances.groupby("code")["expected_members"].sum()
    for code, mean in final.set_index("code")["mean"].items():
        if code in expected.index:
            assert expected[code] == pytest.approx(mean, abs=24 * 0.005)


def test_seats_against_votes_hold_the_cube_law_they_were_made_from():
    draws = made_up_draws(draws=200, dates=1)
    contest = made_up_contest()
    table = build_seats_votes_table(made_up_shifted(draws, seats=2400), codes=contest_codes(contest))
    fer = table[table["code"] == "FER"]
    curve = fer[fer["what"] == SeatsVotes.CURVE]
    assert curve["votes"].diff().dropna().tolist() == pytest.approx([1.0] * (len(curve) - 1))
    votes = draws["national_support_polling_day"].values.reshape(-1, 5)
    share = votes[:, 0]
    others = votes[:, 1:] / (1 - share)[:, None]  # keep their proportions where FER moves
    at = curve["votes"].to_numpy()[:, None, None] / 100
    cubed = ((1 - at) * others[None]) ** 3
    law = 2400 * at[..., 0] ** 3 / (at[..., 0] ** 3 + cubed.sum(axis=-1))
    assert curve["mean"].to_numpy() == pytest.approx(law.mean(axis=1), rel=0.01)
    lead = table[(table["what"] == SeatsVotes.LEAD_AT_EQUAL_VOTES) & (table["against"] == "LAN")].iloc[0]
    assert lead["mean"] == pytest.approx(0, abs=1.5)  # one law for both: the map favours neither
    slope = fer[fer["what"] == SeatsVotes.RESPONSIVENESS].iloc[0]
    assert slope["votes"] == pytest.approx(100 * share.mean(), abs=0.01)


def test_the_share_needed_is_where_the_curve_meets_the_line(contents):
    table = pd.DataFrame(
        {
            "code": "FER",
            "what": ["curve"] * 3 + ["responsiveness"],
            "votes": [40.0, 41.0, 42.0, 41.0],
            "mean": [8.0, 12.0, 16.0, 4.0],
        }
    )
    assert share_for_majority(table, code="FER", line=13) == pytest.approx(41.25)
    assert share_for_majority(table, code="FER", line=17) is None
    assert share_for_majority(table, code="FER", line=7) is None


def test_the_page_says_who_reaches_the_line_which_seats_decide_and_what_votes_bring(contents):
    together = combinations_table(contents)
    assert together.rows[0][0].startswith("Ferry Party")
    assert "Arithmetic only" in together.caption
    assert any(row[0].endswith("Hedge League\nGlow Pact") for row in together.rows)
    assert {row[2] for row in deciding_seats_table(contents).rows} == {"Ferry Party", "Glow Pact"}
    assert [row[0] for row in seats_votes_table(contents).rows] == [
        "Ferry Party",
        "Lantern Union",
        "Glow Pact",
    ]
    first, second = equal_votes_sentences(contents)
    assert first.startswith("If Ferry Party and Lantern Union had equal votes")
    assert "90 % interval of the difference" in second


def test_a_seat_more_at_equal_votes_is_one_seat(contents):
    table = contents.tables.seats_votes.copy()
    rows = table["what"] == SeatsVotes.LEAD_AT_EQUAL_VOTES
    table.loc[rows, ["votes", "mean", "q05", "q95"]] = [35.7, -1.2, -4.0, 2.0]
    told = equal_votes_sentences(replace(contents, tables=replace(contents.tables, seats_votes=table)))[0]
    assert told == (
        "If Lantern Union and Ferry Party had equal votes (35.7 % each), Lantern Union would have 1 seat "
        "more (90 % interval of the difference −2 to 4)."
    )


def test_votes_seat_by_seat_stay_out_of_the_file_of_draws(run):
    tree = build_draws_tree(run["draws"], seats=run["seats"])
    assert "won" not in tree["seats"]
    assert "seat_votes" not in tree["seats"]
    assert {"seat_chance", "seat_expected", "seats_polling_day"} <= set(tree["seats"].data_vars)


@pytest.mark.parametrize(
    ("counting", "said"),
    [
        (Counting(), "The party with most votes wins the seat."),
        (
            Counting(rule=CountingRule.TWO_ROUND, run_off_threshold=12.5),
            "Who has more than 50 % of the votes wins the seat; else all with 12.5 % or more run again",
        ),
        (
            Counting(rule=CountingRule.HIGHEST_AVERAGES, threshold=5, exempt=("HED",)),
            "A list must have 5 % of the votes, counted district by district. HED need not.",
        ),
        (
            Counting(rule=CountingRule.MIXED_COMPENSATORY, list_seats=10, across=Across.COUNTRY),
            "bring all to proportion, over the whole country by D'Hondt's divisors: a party with more local "
            "seats than its part keeps them, and the chamber grows by them.",
        ),
    ],
)
def test_the_note_says_how_votes_become_seats(contents, counting, said):
    contest = contents.contest.model_copy(update={"counting": counting})
    inputs = replace(contents.inputs, contest=contest)
    assert said in " ".join(describe_counting(replace(contents, inputs=inputs)))


def test_a_contest_that_counts_by_several_rules_says_where_each_holds(contents):
    where = CountingWhere(rule=CountingRule.TWO_ROUND, regions=("PORT",))
    contest = contents.contest.model_copy(update={"counting": Counting(where=(where,))})
    told = describe_counting(replace(contents, inputs=replace(contents.inputs, contest=contest)))
    assert any(line.startswith("In The Skerries and Upper Downs: The party with most votes") for line in told)
    assert any(line.startswith("In Port and Quays: Who has more than 50 %") for line in told)


def test_votes_across_the_country_are_those_of_the_regions_that_count_alike(contents):
    where = CountingWhere(rule=CountingRule.PLURALITY, regions=("PORT",))
    counting = Counting(
        rule=CountingRule.HIGHEST_AVERAGES, across=Across.COUNTRY, threshold=4, where=(where,)
    )
    contest = contents.contest.model_copy(update={"counting": counting})
    told = describe_counting(replace(contents, inputs=replace(contents.inputs, contest=contest)))
    assert "A list must have 4 % of the votes, counted over all of these." in told
    assert "over the whole country" not in " ".join(told)


def test_the_page_says_what_the_seats_too_close_to_call_carry(contents):
    table = contents.tables.deciding_seats
    code = deciding_seats_table(contents).caption.split(" of the variance of ")[-1].rstrip(".")
    short = {name: short for short, name in contents.names.items()}[code]
    close = table[(table["code"] == short) & (table["too_close"] == "yes")]
    assert 0 < close["carries"].sum() <= 100.1
    assert f"the {len(close)} seats too close to call carry" in deciding_seats_table(contents).caption
    none = replace(contents, tables=replace(contents.tables, deciding_seats=table.assign(too_close="no")))
    assert "Together" not in deciding_seats_table(none).caption
