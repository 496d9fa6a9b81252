"""The opening sentences: their numbers stand in the tables, and no leader is named too early."""

import re
from dataclasses import replace
from pathlib import Path

import pandas as pd
import pytest

from aggregator.release.chamber import Chamber
from aggregator.release.headlines import build_headlines
from aggregator.release.rounding import chance_text, share_interval_text, share_text, whole_text
from aggregator.release.table_files import round_table
from aggregator.release.table_rows import last_row, likeliest, national_parties
from aggregator.release.table_words import Kind
from aggregator.release.tables import ReleaseTables, build_tables
from aggregator.seats.majorities import Outcome
from tests.made_up_draws import made_up_draws
from tests.release.made_up_desk import (
    contest_without_seats,
    made_up_inputs,
    made_up_polls_worth,
    made_up_screens,
    made_up_seats,
    made_up_shelf_life,
)

CHAMBER = Chamber(24, 13, size=(24, 24), line=(13, 13), middle_line=13, grows=False, line_moves=False)


@pytest.fixture(scope="module")
def inputs(tmp_path_factory):
    draws = made_up_draws(dates=3, draws=60)
    return made_up_inputs(tmp_path_factory.mktemp("contest"), draws=draws)


@pytest.fixture(scope="module")
def tables(inputs):
    draws = made_up_draws(dates=3, draws=60)
    built = build_tables(
        inputs,
        draws=draws,
        seats=made_up_seats(draws),
        shelf_life=made_up_shelf_life(inputs.contest),
        polls_worth=made_up_polls_worth(inputs),
        screens=made_up_screens(inputs),
    )
    pairs = ((Path(schema.path).stem, schema, table) for schema, table in built.with_schemas())
    return ReleaseTables(**{name: round_table(table, schema=schema) for name, schema, table in pairs})


def with_chance(tables: ReleaseTables, outcome: Outcome, probability: float, word: str) -> ReleaseTables:
    """The same tables with the first party's chance of an outcome set, the others below it."""
    chances = tables.chances.copy()
    rows = chances["outcome"] == outcome
    chances.loc[rows, "probability"] = 0.01
    chances.loc[rows & (chances["code"] == "FER"), ["probability", "likelihood"]] = [probability, word]
    return replace(tables, chances=chances)


def headlines(tables, contest):
    return build_headlines(tables, contest=contest, chamber=CHAMBER)


def test_the_numbers_of_the_support_sentence_are_those_of_the_table(tables, inputs):
    told = headlines(with_chance(tables, Outcome.MOST_SUPPORT, 0.84, "likely"), inputs.contest).support
    row = last_row(tables.support[tables.support["region"] == ""], code="FER", kind=Kind.ON_POLLING_DAY)
    assert told == (
        "On polling day, 15 May 2033, Ferry Party is likely (84 %) to have the most support: "
        f"{share_text(row['mean'])} of the vote "
        f"(90 % interval {share_interval_text(row['q05'], row['q95'])})."
    )


def test_the_numbers_of_the_seats_sentence_are_those_of_the_tables(tables, inputs):
    told = headlines(with_chance(tables, Outcome.LARGEST, 0.91, "very likely"), inputs.contest).seats
    row = last_row(tables.seats, code="FER", kind=Kind.ON_POLLING_DAY)
    alone = likeliest(tables.chances, Outcome.MAJORITY_ALONE, kind=Kind.ON_POLLING_DAY)
    together = likeliest(tables.chances, Outcome.MAJORITY_ONLY_AS_ALLIANCE, kind=Kind.ON_POLLING_DAY)
    assert told == (
        "On polling day Ferry Party is very likely (91 %) to win the most seats: "
        f"{whole_text(row['mean'])} of 24 "
        f"(90 % interval {whole_text(row['q05'])} to {whole_text(row['q95'])}). "
        f"Alone, it is {alone['likelihood']} ({chance_text(alone['probability'])}) "
        "to reach a majority of 13; "
        f"Glow Pact is {together['likelihood']} ({chance_text(together['probability'])}) "
        "to reach one with its members together, none of them alone."
    )


def test_an_alliance_the_party_belongs_to_is_told_as_what_it_falls_back_on(tables, inputs):
    pact = inputs.contest.alliances[0].model_copy(update={"members": ("FER", "HED")})
    contest = inputs.contest.model_copy(update={"alliances": (pact,)})
    chances = tables.chances.copy()
    alone = (chances["outcome"] == Outcome.MAJORITY_ALONE) & (chances["code"] == "FER")
    chances.loc[alone, ["probability", "likelihood"]] = [0.56, "about as likely as not"]
    only = chances["outcome"] == Outcome.MAJORITY_ONLY_AS_ALLIANCE
    chances.loc[only, ["probability", "likelihood"]] = [0.04, "very unlikely"]
    told = headlines(replace(tables, chances=chances), contest).seats
    assert told.endswith(
        "is about as likely as not (56 %) to reach a majority of 13; "
        "it is very unlikely (4 %) to fall short but get there with its partners in Glow Pact."
    )


def test_the_number_of_the_worth_sentence_is_that_of_the_table(tables, inputs):
    row = tables.shelf_life.query("code == 'FER' and age_days == 30").iloc[0]
    first = national_parties(tables.support, kind=Kind.ON_DATE)["code"].iloc[0]
    assert first == "FER"
    assert headlines(tables, inputs.contest).worth == (
        "A poll of 1,000 taken a month ago tells as much about support for Ferry Party now as "
        f"{row['worth_today']:.0f} people asked today "
        f"(90 % interval {row['worth_today_q05']:.0f} to {row['worth_today_q95']:.0f})."
    )


@pytest.mark.parametrize(("probability", "named"), [(0.6599, False), (0.66, True), (0.97, True)])
def test_no_leader_is_named_below_66_percent(tables, inputs, probability, named):
    for outcome in (Outcome.MOST_SUPPORT, Outcome.LARGEST):
        told = headlines(with_chance(tables, outcome, probability, "any word"), inputs.contest)
        sentence = told.support if outcome is Outcome.MOST_SUPPORT else told.seats
        assert ("no party is likely" in sentence) is not named
        assert ("Ferry Party is any word" in sentence) is named
        if not named:
            assert "Lantern Union" in sentence  # both at the top are told, with their intervals
            assert sentence.count(" to ") >= 2


def test_the_statements_are_never_mixed(tables, inputs):
    phrases = ("people asked today", "if people voted on", "on polling day")
    cases = [headlines(tables, inputs.contest)]
    without = replace(tables, seats=None, seat_chances=None)
    cases.append(build_headlines(without, contest=contest_without_seats(), chamber=None))
    for told in cases:
        for sentence in told.sentences:
            assert sum(phrase in sentence.lower() for phrase in phrases) == 1, sentence


@pytest.mark.parametrize(("probability", "word"), [(0.5, "about as likely as not"), (0.95, "very likely")])
def test_without_seats_the_second_sentence_is_about_the_lead_on_the_day_of_the_run(tables, probability, word):
    without = replace(
        with_chance(tables, Outcome.MOST_SUPPORT, probability, word), seats=None, seat_chances=None
    )
    told = build_headlines(without, contest=contest_without_seats(), chamber=None).seats
    assert told.startswith("If people voted on 6 March 2033,")
    assert "seats" not in told
    assert ("would be very likely (95 %) to lead" in told) is (probability > 0.66)


def test_without_an_alliance_the_seats_sentence_speaks_of_none(tables, inputs):
    chances = tables.chances[tables.chances["outcome"] != Outcome.MAJORITY_ONLY_AS_ALLIANCE]
    contest = inputs.contest.model_copy(update={"alliances": ()})
    told = headlines(replace(tables, chances=chances), contest).seats
    assert "together" not in told
    assert told.endswith("to reach a majority of 13.")


def test_a_shelf_life_without_the_thirtieth_day_names_the_nearest_age(tables, inputs):
    ages = tables.shelf_life[tables.shelf_life["age_days"].isin([0, 10, 20])]
    told = headlines(replace(tables, shelf_life=ages), inputs.contest).worth
    assert "taken 20 days ago" in told


def test_only_words_of_the_scale_are_used_for_chances(tables, inputs):
    told = " ".join(headlines(tables, inputs.contest).sentences)
    for word in re.findall(r"(\w+) \(\d+ %\)", told):
        assert word in {"likely", "unlikely", "certain", "not"}
    assert not re.search(r"probabl|certainly|doubt|expect to|sure", told)


def test_rows_are_picked_from_the_last_date():
    rows = pd.DataFrame(
        {
            "date": pd.to_datetime(["2033-02-01", "2033-03-01"]),
            "code": "FER",
            "kind": "on_date",
            "mean": [1.0, 2.0],
        }
    )
    assert last_row(rows, code="FER", kind=Kind.ON_DATE)["mean"] == 2.0
    assert last_row(rows, code="LAN", kind=Kind.ON_DATE) is None
