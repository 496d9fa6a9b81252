"""The tables of a release: what they add up to, and what may stand in them."""

import csv
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from aggregator.problems import Problem, Severity
from aggregator.release.chances_table import build_chances_table
from aggregator.release.poll_tables import build_polls_used_table, build_polls_weighed_table
from aggregator.release.table_files import SchemaError, check_table, csv_text, inert_cell, round_table
from aggregator.release.table_schemas import ALL_SCHEMAS, SUPPORT
from aggregator.release.table_words import Kind, Level
from aggregator.release.tables import build_tables
from aggregator.seats.majorities import Outcome
from tests.made_up_draws import made_up_contest, made_up_draws
from tests.release.made_up_desk import (
    contest_without_seats,
    made_up_checks,
    made_up_inputs,
    made_up_polls_worth,
    made_up_screens,
    made_up_seats,
    made_up_shelf_life,
    made_up_shifted,
)

WHOLE = [Level.PARTY, Level.OTHERS]


@pytest.fixture(scope="module")
def run(tmp_path_factory):
    draws = made_up_draws(dates=4, draws=80)
    inputs = made_up_inputs(tmp_path_factory.mktemp("contest"), draws=draws)
    return inputs, draws, made_up_seats(draws)


@pytest.fixture(scope="module")
def tables(run):
    inputs, draws, seats = run
    return build_tables(
        inputs,
        draws=draws,
        seats=seats,
        shelf_life=made_up_shelf_life(inputs.contest),
        polls_worth=made_up_polls_worth(inputs),
        screens=made_up_screens(inputs),
        shifted=made_up_shifted(draws),
        checks=made_up_checks(draws, seats),
    )


def test_every_table_holds_what_its_schema_says(tables):
    found = list(tables.with_schemas())
    assert [schema.path for schema, _ in found] == [schema.path for schema in ALL_SCHEMAS]
    for schema, table in found:
        check_table(round_table(table, schema=schema), schema=schema)


def test_shares_sum_to_100_on_every_date_in_every_region_without_the_alliances(tables):
    table = round_table(tables.support, schema=SUPPORT)
    sums = table[table["level"].isin(WHOLE)].groupby(["date", "region", "kind"])["mean"].sum()
    assert len(sums) == 5 * 4
    assert sums.sub(100).abs().max() < 0.03


def test_seats_sum_to_the_chamber_on_every_date_without_the_alliances(tables):
    table = tables.seats
    sums = table[table["level"].isin(WHOLE)].groupby(["date", "kind"])["mean"].sum()
    assert np.allclose(sums, 24)


def test_expected_seats_are_the_sum_of_the_seats_chances(tables, run):
    final = tables.seats[tables.seats["kind"] == Kind.ON_POLLING_DAY].set_index("code")["mean"]
    chances = tables.seat_chances.groupby("code")["chance"].sum()
    for code, expected in chances.items():
        assert expected == pytest.approx(final[code], abs=24 * 0.5 / run[1].sizes["draw"])


def test_an_alliance_is_the_sum_of_its_members_draw_by_draw(tables, run):
    draws = run[1]
    together = 100 * draws["national_support_polling_day"].sel(party=["LAN", "HED"]).sum("party")
    row = tables.support.query("code == 'GLOW' and region == '' and kind == 'on_polling_day'").iloc[0]
    assert row["level"] == Level.ALLIANCE
    assert row["mean"] == pytest.approx(float(together.mean()))
    assert row["sd"] == pytest.approx(float(together.std()))
    assert row["q95"] == pytest.approx(float(together.quantile(0.95)))


def test_an_alliance_has_rows_only_for_the_days_on_which_it_exists(run):
    inputs, draws, seats = run
    days = [pd.Timestamp(day).date() for day in draws["date"].values]
    contest = inputs.contest.model_copy(
        update={"alliances": (inputs.contest.alliances[0].model_copy(update={"from_": days[2]}),)}
    )
    found = build_tables(
        replace(inputs, contest=contest),
        draws=draws,
        seats=seats,
        shelf_life=made_up_shelf_life(contest),
        polls_worth=made_up_polls_worth(inputs),
        screens=made_up_screens(inputs),
    )
    for table in (found.support[found.support["region"] == ""], found.seats):
        there = table[(table["code"] == "GLOW") & (table["kind"] == Kind.ON_DATE)]["date"]
        assert [day.date() for day in there] == days[2:]


def test_a_party_has_no_row_in_a_region_where_it_does_not_stand(tables):
    skerry = tables.support[tables.support["region"] == "SKERRY"]
    assert "HED" not in set(skerry["code"])
    assert "HED" in set(tables.support[tables.support["region"] == "PORT"]["code"])


def test_regional_polling_days_date_the_regional_rows(run, tables):
    inputs, draws, _ = run
    early = inputs.contest.polling_day.replace(day=8)
    regions = tuple(
        region.model_copy(update={"polling_day": early}) if region.code == "PORT" else region
        for region in inputs.contest.regions
    )
    contest = inputs.contest.model_copy(update={"regions": regions})
    found = build_tables(
        replace(inputs, contest=contest),
        draws=draws,
        seats=None,
        shelf_life=made_up_shelf_life(contest),
        polls_worth=made_up_polls_worth(inputs),
        screens=made_up_screens(inputs),
    ).support
    final = found[found["kind"] == Kind.ON_POLLING_DAY]
    assert {d.date() for d in final[final["region"] == "PORT"]["date"]} == {early}
    assert {d.date() for d in final[final["region"] == ""]["date"]} == {contest.polling_day}


def test_chances_of_leading_and_of_majorities_each_cover_everything_that_can_happen(tables):
    for _, rows in tables.chances.groupby(["date", "kind"]):
        by = rows.groupby("outcome")["probability"].sum()
        assert by[Outcome.MOST_SUPPORT] == pytest.approx(1, abs=0.02)
        assert by[Outcome.LARGEST] == pytest.approx(1, abs=0.02)
        majority = [Outcome.MAJORITY_ALONE, Outcome.MAJORITY_ONLY_AS_ALLIANCE, Outcome.NO_MAJORITY]
        assert by[majority].sum() == pytest.approx(1, abs=0.03)


def test_chances_against_counting_by_hand(run):
    """Six draws written out: leads, a tie, a majority alone, one only together, and none."""
    draws = made_up_draws(chains=1, draws=6, dates=1)
    seats = made_up_seats(draws)
    parties = [str(code) for code in draws["party"].values]
    by_hand = {"FER": [13, 8, 8, 10, 0, 9], "LAN": [5, 8, 10, 2, 20, 9], "HED": [3, 4, 4, 1, 2, 3]}
    counted = np.zeros((1, 6, len(parties)), dtype=np.int16)
    for code, won in by_hand.items():
        counted[0, :, parties.index(code)] = won
    counted[0, :, parties.index("OTH")] = 24 - counted[0].sum(axis=-1)
    seats["seats_polling_day"] = (("chain", "draw", "party"), counted)
    contest = made_up_contest()
    table = build_chances_table(draws, seats=seats, contest=contest)
    final = table[table["kind"] == Kind.ON_POLLING_DAY].set_index(["outcome", "code"])["probability"]

    def of_six(count):
        return pytest.approx((count + 0.5) / 7, abs=6e-5)

    assert final[Outcome.LARGEST, "FER"] == of_six(3)  # twice alone, twice tied with LAN
    assert final[Outcome.LARGEST, "LAN"] == of_six(3)
    assert final[Outcome.MAJORITY_ALONE, "FER"] == of_six(1)
    assert final[Outcome.MAJORITY_ALONE, "LAN"] == of_six(1)
    assert final[Outcome.MAJORITY_ONLY_AS_ALLIANCE, "GLOW"] == of_six(1)  # 10 + 4 of 24
    assert final[Outcome.NO_MAJORITY, ""] == of_six(3)
    assert (Outcome.LARGEST, "OTH") not in final.index


def test_monte_carlo_errors_are_never_zero_and_shrink_with_more_draws(run):
    contest = made_up_contest()
    errors = []
    for count in (50, 800):
        draws = made_up_draws(chains=2, draws=count, dates=1)
        table = build_chances_table(draws, seats=None, contest=contest)
        final = table[table["kind"] == Kind.ON_POLLING_DAY].set_index("code")
        assert (final["mc_error"] > 0).all()
        errors.append(final.loc["FER", "mc_error"])
    # Independent draws: the error is the binomial one, sqrt(p (1 - p) / S).
    assert errors[1] == pytest.approx(0.5 / np.sqrt(1600), rel=0.25)
    assert errors[0] > 2.5 * errors[1]


def test_nothing_is_said_about_seats_where_nothing_is_counted(run):
    inputs, draws, _ = run
    contest = contest_without_seats()
    found = build_tables(
        replace(inputs, contest=contest),
        draws=draws,
        seats=None,
        shelf_life=made_up_shelf_life(contest),
        polls_worth=made_up_polls_worth(inputs),
        screens=made_up_screens(inputs),
    )
    assert found.seats is None
    assert found.seat_chances is None
    assert set(found.chances["outcome"]) == {Outcome.MOST_SUPPORT}


def test_a_poll_and_its_regional_rows_are_one_poll_whose_respondents_count_once(run):
    inputs, *_ = run
    polls = inputs.polls.head(3).copy()
    polls["poll"] = "SPLIT"
    polls["regions"] = [("SKERRY",), ("DOWNS",), ("PORT",)]
    polls["sample"] = [200, 300, 500]
    polls["poll_respondents"] = 1000
    worth = pd.DataFrame({"poll": ["SPLIT"], "worth_today": [640.0]})
    table = build_polls_used_table(polls, polls_worth=worth, contest=inputs.contest)
    assert len(table) == 1
    row = table.iloc[0]
    assert (row["regions"], row["sample"], row["respondents"], row["worth_today"]) == ("", 1000, 1000, 640.0)
    partly = build_polls_used_table(polls.head(2), polls_worth=worth, contest=inputs.contest).iloc[0]
    assert (partly["regions"], partly["sample"]) == ("SKERRY+DOWNS", 500)


def test_the_desk_sees_every_row_of_the_register_with_its_reason_and_doubts(run):
    inputs, *_ = run
    doubt = Problem("polls.csv", 3, "sample", "40000", "below 20,000", "Check it.", "P17", Severity.WARNING)
    table = build_polls_weighed_table(
        inputs.polls,
        unused_polls=inputs.unused_polls,
        polls_worth=made_up_polls_worth(inputs),
        screens=made_up_screens(inputs),
        warnings=[doubt],
    )
    assert len(table) == len(inputs.polls) + 1
    assert table["row"].is_monotonic_increasing
    left_out = table[table["used"] == "no"].iloc[0]
    assert (left_out["why_not"], left_out["poll"]) == ("exit poll", "X1")
    assert table.set_index("row").loc[3, "warnings"] == "sample: found 40000; expected below 20,000"
    assert table["screens"].tolist() == ["sample_size", *[""] * (len(table) - 1)]


@pytest.mark.parametrize(
    "spoil",
    [
        lambda t: t.drop(columns="sd"),
        lambda t: t.assign(mean=101.0),
        lambda t: t.assign(mean=np.nan),
        lambda t: t.assign(level="bloc"),
        lambda t: t.assign(date="2033-01-01"),
        lambda t: t[t.columns[::-1]],
    ],
)
def test_a_table_that_breaks_its_schema_is_refused(tables, spoil):
    with pytest.raises(SchemaError, match=r"support\.csv"):
        check_table(spoil(tables.support), schema=SUPPORT)


@pytest.mark.parametrize("text", ["=1+1", "+44", "-x", "@SUM(A1)", "\tx", "\rx"])
def test_a_cell_that_a_spreadsheet_would_run_gets_an_apostrophe(text):
    assert inert_cell(text) == f"'{text}"
    assert inert_cell("Plumb Line") == "Plumb Line"


def test_numbers_keep_their_minus_sign_and_only_typed_text_gets_the_apostrophe(tables):
    schema = next(s for s in ALL_SCHEMAS if s.path.endswith("houses.csv"))
    table = round_table(tables.houses.assign(house="-5 Surveys"), schema=schema)
    first = next(csv.DictReader(csv_text(table, schema=schema, caution=None).splitlines()))
    assert first["house"] == "'-5 Surveys"
    assert first["q05"].startswith("-")
    assert "caution" not in csv_text(table, schema=schema, caution=None).splitlines()[0]
    assert csv_text(table, schema=schema, caution="CHECKS FAILED").splitlines()[0].endswith(",caution")


def test_order_of_draws_and_chains_changes_no_table(run, tables):
    inputs, draws, seats = run
    turned = draws.isel(draw=slice(None, None, -1), chain=slice(None, None, -1))
    found = build_tables(
        inputs,
        draws=turned,
        seats=seats.isel(draw=slice(None, None, -1), chain=slice(None, None, -1)),
        shelf_life=made_up_shelf_life(inputs.contest),
        polls_worth=made_up_polls_worth(inputs),
        screens=made_up_screens(inputs),
    )
    pd.testing.assert_frame_equal(
        round_table(found.support, schema=SUPPORT), round_table(tables.support, schema=SUPPORT), atol=0.011
    )
    pd.testing.assert_frame_equal(found.seats, tables.seats)
