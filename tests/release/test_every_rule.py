"""A release can be made of a chamber counted by any rule, and says of it what there is to say."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from aggregator.inputs.contest import Contest
from aggregator.release.charts import build_charts
from aggregator.release.method_note import build_method_note
from aggregator.release.page import build_page
from aggregator.release.table_files import check_table
from aggregator.release.table_words import Kind, Level
from aggregator.release.write_release import build_contents
from aggregator.seats.counting import count_prepared
from aggregator.seats.prepare import prepare_seats
from aggregator.seats.shifted_chamber import count_votes_to_seats
from tests.made_up_draws import made_up_contest, made_up_draws, made_up_last_result
from tests.release.made_up_desk import made_up_run

DHONDT = {"rule": "highest_averages", "divisors": "dhondt"}
# Rule, members of each of the 24 rows, regular seats, whether rows fill seats, whether seats may decide.
RULES = {
    "plurality": ({"rule": "plurality"}, 1, 24, True, True),
    "two rounds": ({"rule": "two_round"}, 1, 24, True, True),
    "districts": (DHONDT, 4, 96, True, False),
    "regions": ({**DHONDT, "across": "region"}, 4, 96, False, False),
    "country": ({**DHONDT, "across": "country", "threshold": 5.0}, 4, 96, False, False),
    "parallel": ({"rule": "mixed_parallel", "list_seats": 20}, 1, 44, True, True),
    "overhang kept": (
        {"rule": "mixed_compensatory", "list_seats": 4, "overhang": "kept"},
        1,
        28,
        True,
        False,
    ),
    "levelled": ({"rule": "mixed_compensatory", "list_seats": 4, "overhang": "levelled"}, 1, 28, True, False),
    "two rounds in one region": (
        {**DHONDT, "across": "region", "where": [{"rule": "two_round", "regions": ["SKERRY"]}]},
        1,
        24,
        True,
        True,
    ),
}


def release_of(folder, counting, members):
    draws = made_up_draws(draws=60, dates=3)
    plain = made_up_contest().model_dump(by_alias=True, exclude={"counting"})
    contest = Contest.model_validate({**plain, "counting": counting})
    result = made_up_last_result().assign(seats=members, cluster="")
    codes = contest.party_codes
    pairs = [(a, b, 40.0, 5.0) for a in codes for b in codes if a != b]
    prepared = prepare_seats(
        draws,
        last_result=result,
        contest=contest,
        rng=np.random.default_rng(3),
        transfers=pd.DataFrame(pairs, columns=["from", "to", "rate", "sd"]),
    )
    seats = count_prepared(prepared, draws=draws, contest=contest, order=result["seat"])
    run = made_up_run(folder, dates=3)
    inputs = replace(run.pop("inputs"), contest=contest, last_result=result)
    shifted = count_votes_to_seats(prepared, draws=draws, seats=seats, contest=contest)
    return build_contents(inputs, **run | {"draws": draws, "seats": seats, "shifted": shifted})


@pytest.mark.parametrize("name", RULES)
def test_a_release_of_any_rule_has_the_tables_and_sections_that_make_sense(name, tmp_path):
    counting, members, regular, rows, decides = RULES[name]
    contents = release_of(tmp_path, counting, members)
    tables = contents.tables
    for schema, table in tables.with_schemas():
        check_table(table, schema=schema)
    assert contents.chamber.regular == regular
    assert contents.chamber.grows is ("overhang" in counting)
    final = tables.seats[
        (tables.seats["kind"] == Kind.ON_POLLING_DAY) & (tables.seats["level"] != Level.ALLIANCE)
    ]
    low, high = contents.chamber.size
    assert low - 0.1 <= final["mean"].sum() <= high + 0.1
    assert (tables.seat_chances is not None) is rows
    assert (tables.deciding_seats is not None) is decides
    assert len(tables.combinations)
    names = {chart.name for chart in build_charts(contents)}
    assert {"seats_on_polling_day", "combinations", "seats_against_votes"} <= names
    page = build_page(contents, charts=[], method_note=build_method_note(contents))
    assert ('id="deciding"' in page) is (decides and len(tables.deciding_seats) > 0)
    assert ('id="closest"' in page) is rows
    assert ("from lists" in page) is ("mixed" in counting["rule"])
    assert "An exact tie is broken by lot; no draw of this release needed it." in page


def test_ties_that_a_lot_had_to_break_are_counted_in_the_note(tmp_path):
    contents = release_of(tmp_path, *RULES["plurality"][:2])
    tied = replace(contents, chamber=replace(contents.chamber, ties=1234))
    assert "this release needed it 1,234 times" in build_method_note(tied)


def test_the_note_says_what_candidates_and_the_result_before_the_last_do(tmp_path):
    contents = release_of(tmp_path, *RULES["plurality"][:2])
    assert "without a candidate" not in build_method_note(contents)
    listed = pd.DataFrame({"seat": ["DO01"], "code": ["FER"], "name": [""], "holder": [True]})
    told = build_method_note(
        replace(contents, inputs=replace(contents.inputs, candidates=listed, before_last=listed))
    )
    for words in ("without a candidate", "Sitting members", "learned from the last two results"):
        assert words in told
