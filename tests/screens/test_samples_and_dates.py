"""Samples and dates unlike a house's own habit, and samples that may be several put together."""

from __future__ import annotations

import pandas as pd
import pytest

from aggregator.screens.habits import ask_about_sample_sizes, ask_about_timing
from aggregator.screens.pooled_samples import ask_about_pooled_samples
from aggregator.screens.register_series import poll_table
from tests.screens.made_up_registers import REGIONS, tidy_register


@pytest.fixture
def polls() -> pd.DataFrame:
    return tidy_register(1, polls=80)


def table(polls: pd.DataFrame) -> pd.DataFrame:
    return poll_table(polls, regions=REGIONS)


def days(number: int) -> pd.Timedelta:
    return pd.Timedelta(days=number)


def test_usual_samples_and_dates_raise_no_question(polls):
    assert ask_about_sample_sizes(table(polls)) == []
    assert ask_about_timing(table(polls)) == []
    assert ask_about_pooled_samples(table(polls)) == []


@pytest.mark.parametrize("times", [5.0, 0.2])
def test_a_digit_too_many_or_too_few_in_a_sample_is_asked_about(polls, times):
    polls.loc[20, "sample"] *= times
    (question,) = ask_about_sample_sizes(table(polls))
    assert question.polls == "P020"
    assert "digit" in question.question


def test_regional_polls_have_a_habit_of_their_own(polls):
    small = polls["house"].eq("House 1") & (polls.index % 16 == 1)
    polls.loc[small, "sample"] /= 4
    assert {q.house for q in ask_about_sample_sizes(table(polls))} <= {"House 1"}
    regional = polls["regions"].where(~small, pd.Series([("NORTH",)] * len(polls)))
    assert ask_about_sample_sizes(table(polls.assign(regions=regional))) == []


def test_a_poll_and_its_regional_rows_are_one_sample(polls):
    rows = polls.loc[[20, 20]].assign(regions=[("NORTH",), ("SOUTH",)], sample=[600.0, 500.0])
    whole = table(pd.concat([polls.drop(20), rows]))
    poll = whole[whole["poll"] == "P020"].iloc[0]
    assert (poll["sample"], poll["kind"]) == (1100, "national")


def test_five_thousand_visits_in_a_day_are_asked_about(polls):
    polls.loc[20, "start"] = polls.loc[20, "end"]
    polls.loc[20, "sample"] = 20 * polls["sample"].median()
    assert {q.polls for q in ask_about_timing(table(polls))} == {"P020"}


def test_a_house_with_one_poll_is_held_against_its_mode(polls):
    polls.loc[20, ["house", "sample"]] = ["Newcomer", 60_000.0]
    polls.loc[20, "start"] = polls.loc[20, "end"]
    (question,) = ask_about_timing(table(polls))
    assert question.house == "Newcomer"


def test_a_house_that_needs_a_week_and_publishes_on_the_day_is_asked(polls):
    house = polls["house"] == "House 4"
    polls.loc[house, "published"] = polls.loc[house, "end"] + days(8)
    polls.loc[20, "published"] = polls.loc[20, "end"]
    (question,) = ask_about_timing(table(polls))
    assert question.polls == "P020"
    assert question.found == "published 0 day(s) after fieldwork ended"
    assert "left blank" in question.question


def test_long_windows_are_one_question_per_house(polls):
    house = polls.index[polls["house"] == "House 4"][:2]
    polls.loc[house, "start"] = polls.loc[house, "end"] - days(44)
    questions = [q for q in ask_about_pooled_samples(table(polls)) if "days" in q.found]
    assert [(q.house, q.polls) for q in questions] == [("House 4", "; ".join(polls.loc[house, "poll"]))]


def test_a_poll_made_of_earlier_polls_is_recognised_by_window_and_sum(polls):
    house = polls[polls["house"] == "House 4"].sort_values("end").head(3)
    pooled = house.iloc[[2]].assign(
        poll="POOLED",
        start=house["start"].min(),
        end=house["end"].max() + days(1),
        sample=house["sample"].sum(),
    )
    found = ask_about_pooled_samples(table(pd.concat([polls, pooled])))
    (question,) = [q for q in found if "together" in q.found]
    assert question.polls == "; ".join(["POOLED", *house.sort_index()["poll"]])
    own = pooled.assign(sample=0.5 * house["sample"].sum())
    assert not [q for q in ask_about_pooled_samples(table(pd.concat([polls, own]))) if "together" in q.found]
