"""What page, note and desk say of eras, modes, other assumptions and the tests of the fit."""

from __future__ import annotations

import csv
from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from aggregator.inputs.contest import Jolt
from aggregator.release.assumption_words import assumptions_table, shared_lean_sentences
from aggregator.release.charts import build_charts
from aggregator.release.grounds_words import describe_grounds
from aggregator.release.houses_table import build_houses_table
from aggregator.release.lean_page_tables import asked_together_sentences, houses_table, ways_of_asking_table
from aggregator.release.method_note import build_method_note
from aggregator.release.mode_leans_table import build_mode_leans_table, told_words
from aggregator.release.model_checks import NO_CHECKS
from aggregator.release.predictive_words import predictive_questions, predictive_sentences
from aggregator.release.run_features import describe_features, summarise_pace
from aggregator.release.write_release import build_contents, write_release
from tests.made_up_draws import made_up_draws
from tests.release.made_up_desk import made_up_run

SHARED_LEAN = {
    "points_at_40": {"FER": 2.52, "LAN": 3.1, "HED": 2.48, "TID": 2.5, "OTH": 2.5},
    "late_undecided": 0.08,
    "undecided_adds": 0.2,
}


@pytest.fixture(scope="module")
def run(tmp_path_factory):
    return made_up_run(tmp_path_factory.mktemp("contest"))


def contents_of(run, **changes):
    arguments = {**run, **changes}
    return build_contents(arguments.pop("inputs"), **arguments)


@pytest.fixture(scope="module")
def contents(run):
    return contents_of(run, settings={"seed": 1, "shared_lean": SHARED_LEAN, "priors": {"ramp_log_sd": 0.5}})


def test_a_house_that_changed_its_way_of_working_has_a_lean_for_each_latest_last(contents):
    rows = contents.tables.houses.query("house == 'Saltbox Surveys' and code == 'FER'")
    assert rows["method"].tolist() == ["door to door", "panel 2032"]
    assert rows["mode"].tolist() == ["face_to_face", "online"]
    assert rows["polls"].tolist() == [3, 4]
    assert (contents.tables.houses.query("house != 'Saltbox Surveys'")["method"] == "").all()


def test_lean_of_a_house_is_its_own_lean_and_that_of_its_mode_and_population():
    """To first order leans add up; the made-up ones do so exactly."""
    draws = made_up_draws(draws=50)
    table = build_houses_table(draws).set_index(["house", "code"])
    modes = build_mode_leans_table(draws).set_index(["kind", "label", "code"])["lean"]
    for code in ("FER", "LAN"):
        row = table.loc[("Tally & Wick", code)]
        asked = modes["mode", "online", code] + modes["population", "adults", code]
        assert row["lean"] == pytest.approx(row["own_lean"] + asked)
        assert row["lean"] != pytest.approx(row["own_lean"])


def test_page_and_chart_name_the_way_of_working_of_a_house_that_has_had_several(contents):
    cells = [row[0] for row in houses_table(contents).rows]
    assert "Saltbox Surveys\npanel 2032, online, voters" in cells
    assert "Plumb Line\ntelephone, voters" in cells
    chart = next(chart for chart in build_charts(contents) if chart.name == "house_leans")
    clear = contents.tables.houses.query("q05 > 0 or q95 < 0")
    if (clear["method"] != "").any():
        assert "Saltbox Surveys (" in chart.alt_text


@pytest.mark.parametrize(
    ("learned", "words"),
    [(0.19, "the polls cannot tell"), (0.2, "partly"), (0.6, "partly"), (0.61, "well")],
)
def test_how_far_polls_tell_a_lean_is_one_of_three_words(learned, words):
    assert told_words(learned) == words


def test_ways_of_asking_stand_beside_the_houses_with_what_the_polls_can_tell(contents):
    rows = {row[0]: row for row in ways_of_asking_table(contents).rows}
    assert set(rows) == {"Asked: face to face", "Asked: online", "Asked: telephone", "Population: adults"}
    assert rows["Asked: face to face"][2] == "the polls cannot tell"
    assert rows["Asked: telephone"][2] == "well"
    (sentence,) = asked_together_sentences(contents)
    assert sentence.startswith("Glow Pact asked about as one gets +0.")
    assert "6 polls" in sentence


def test_table_of_modes_is_there_but_empty_where_all_polls_are_alike(run, tmp_path):
    draws = run["draws"].drop_dims(["mode", "population", "formation"])
    arguments = {**run, "draws": draws}
    written = write_release(arguments.pop("inputs"), **arguments, out=tmp_path / "release")
    lines = (written.path / "public/mode_leans.csv").read_text(encoding="utf-8").splitlines()
    assert lines == ["kind,label,code,lean,q05,q95,houses,polls,learned"]
    assert "ways of asking" not in written.page.read_text(encoding="utf-8")


def test_other_assumptions_show_wider_and_narrower_and_admit_what_needs_a_fit(contents):
    table = contents.tables.assumptions
    width = (
        table.assign(width=table["q95"] - table["q05"]).query("code == 'FER'").set_index("setting")["width"]
    )
    assert width["none"] < 0.6 * width["in use"]
    assert np.isnan(width["0"])
    rows = {row[0].split("\n")[0]: row for row in assumptions_table(contents).rows}
    assert rows["0"][1] == "needs another fit"
    assert "1/3, in use" in rows


def test_numbers_in_use_are_those_of_the_other_tables(contents):
    used = contents.tables.assumptions.query("setting == 'in use'").set_index("code")
    support = contents.tables.support.query("region == '' and kind == 'on_polling_day'").set_index("code")
    seats = contents.tables.seats.query("kind == 'on_polling_day'").set_index("code")
    for code in ("FER", "LAN", "GLOW"):
        assert used.loc[code, "mean"] == support.loc[code, "mean"]
        assert used.loc[code, "seats_q95"] == seats.loc[code, "q95"]
    chances = contents.tables.chances.query("kind == 'on_polling_day' and outcome == 'largest'")
    largest = chances.set_index("code")["probability"]
    assert used.loc["FER", "largest"] == pytest.approx(largest["FER"], abs=1e-4)


def test_size_of_the_shared_lean_is_told_by_party_with_what_the_undecided_add(contents):
    text = " ".join(shared_lean_sentences(contents))
    assert "Lantern Union 3.1" in text
    assert "undecided of late polls, 8.0 %" in text
    assert "adds 0.2 points" in text
    assert "Without it the 90 % interval of Ferry Party" in text


def test_nothing_is_said_of_a_shared_lean_that_is_switched_off(contents):
    contest = contents.contest
    off = contest.model_copy(update={"model": contest.model.model_copy(update={"shared_lean": False})})
    assert shared_lean_sentences(replace(contents, inputs=replace(contents.inputs, contest=off))) == []


def test_houses_that_stand_out_are_counted_for_readers_and_named_at_the_desk_alone(run, tmp_path):
    arguments = dict(run)
    written = write_release(arguments.pop("inputs"), **arguments, out=tmp_path / "release")
    note = (written.path / "public/method.md").read_text(encoding="utf-8")
    assert "Of 120 published figures 88 % lie inside the 90 % interval" in note
    assert "1 of 2 houses stands out" in note
    warnings = (written.path / "desk/warnings.txt").read_text(encoding="utf-8").splitlines()
    (question,) = [line for line in warnings if line.startswith("Weathercock: ")]
    assert question.endswith("?")
    assert question not in written.page.read_text(encoding="utf-8")
    rows = list(csv.DictReader((written.path / "desk/predictive.csv").open(encoding="utf-8")))
    assert rows[2]["stands_out"] == "yes"


def test_without_the_tests_of_the_fit_a_release_says_nothing_of_them(run):
    bare = contents_of(run, checks=NO_CHECKS)
    assert predictive_sentences(bare.tables.predictive) == []
    assert predictive_questions(bare.tables.predictive) == []
    assert describe_grounds(bare) is None
    assert assumptions_table(bare) is None
    note = build_method_note(bare)
    assert "how much assumption" not in note
    assert "other assumptions" not in note


def test_note_says_of_each_number_how_much_is_assumption(contents):
    grounds = describe_grounds(contents)
    assert grounds.lead == "Words on polling day."
    assert grounds.rows[0] == (
        "Ferry Party, support on 6 March 2033",
        "88 %",
        "0 %",
        "12 %",
        "the shared error",
    )
    assert grounds.rows[1][-1] == "the shared error, the polls"


def test_note_lists_what_the_model_had_to_bear_in_this_run(contents):
    contest = contents.contest
    early = contest.regions[0].model_copy(update={"polling_day": date(2033, 2, 27)})
    jolt = Jolt(date=date(2033, 1, 20), weeks=3, name="The ferry strike")
    busy = contest.model_copy(update={"regions": (early, *contest.regions[1:]), "jolts": (jolt,)})
    counted = contents.inputs.last_result.query("region == 'SKERRY'")
    inputs = replace(contents.inputs, contest=busy, counted_result=counted)
    features = {
        feature.heading: feature.text for feature in describe_features(replace(contents, inputs=inputs))
    }
    assert list(features) == [
        "Ways of working", "Modes", "Populations", "Alliances asked about as one", "Pace", "Jolts",
        "Voting in phases", "Counted regions",
    ]  # fmt: skip
    assert "Saltbox Surveys: door to door, panel 2032" in features["Ways of working"]
    assert "20 January 2033, The ferry strike: 3 weeks' worth" in features["Jolts"]
    assert features["Voting in phases"].index("27 February 2033") < features["Voting in phases"].index(
        "15 May"
    )
    assert "The Skerries" in features["Counted regions"]


def test_pace_is_told_with_its_interval_and_as_even_where_the_ramp_is_off(contents):
    draws = made_up_draws(draws=500)
    pace = summarise_pace(draws, prior_sd=0.5)
    assert pace.low < 1 < pace.high
    assert pace.told == pytest.approx(0, abs=0.15)  # drawn from the prior
    assert summarise_pace(draws.drop_vars("ramp_log_height"), prior_sd=0.5) is None
    even = {feature.heading: feature.text for feature in describe_features(replace(contents, pace=None))}
    assert even["Pace"] == "Opinion is taken to move as fast before polling day as ever."


def test_polling_day_of_a_contest_in_phases_is_the_last_one(run):
    contest = run["inputs"].contest
    late = contest.regions[0].model_copy(update={"polling_day": date(2033, 5, 22)})
    phased = contest.model_copy(update={"regions": (late, *contest.regions[1:])})
    contents = contents_of({**run, "inputs": replace(run["inputs"], contest=phased)})
    assert contents.headlines.support.startswith("On polling day, 22 May 2033,")
    final = contents.tables.support.query("kind == 'on_polling_day'")
    assert str(final[final["region"] == ""]["date"].iloc[0].date()) == "2033-05-22"
    assert str(final[final["region"] == "PORT"]["date"].iloc[0].date()) == "2033-05-15"
