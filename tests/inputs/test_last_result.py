"""The last result: votes as counted, handed on to today's parties."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from aggregator.inputs.contest import CountingRule
from aggregator.inputs.last_result import inherit
from tests.inputs.desk_folder import CONTEST, RESULT, findings, read, write_folder


def result_of(tmp_path, **files: str):
    return read(write_folder(tmp_path / "c", **files))


def test_a_party_takes_its_part_and_others_the_rest(tmp_path):
    result = result_of(tmp_path).last_result
    first = result.iloc[0]
    assert list(result.columns) == ["seat", "name", "region", "seats", "cluster", "HU", "UP", "OL", "OTH"]
    assert (first["seat"], first["name"], first["region"]) == ("N1", "Northgate", "NORTH")
    assert first["HU"] == 9120
    assert first["UP"] == pytest.approx(6310 + 800)
    assert first["OTH"] == pytest.approx(880 + 200)


def test_a_blank_cell_is_not_zero_votes(tmp_path):
    result = result_of(tmp_path, result_last_csv=RESULT.replace("9120,6310,,", "9120,6310,0,")).last_result
    assert result["OL"].iloc[0] == 0
    assert math.isnan(result["OL"].iloc[1])


def test_a_split_leaves_the_donor_what_no_one_takes(tmp_path):
    contest = CONTEST.replace('regions = ["MERE"]', "inherits = { HU = 0.25 }")
    column = RESULT.splitlines()[0].split(",").index("OL")
    rows = [row.split(",") for row in RESULT.splitlines()]
    text = "\n".join(",".join(row[:column] + row[column + 1 :]) for row in rows)
    result = result_of(tmp_path, contest_toml=contest, result_last_csv=text).last_result
    assert result["HU"].iloc[0] == pytest.approx(0.75 * 9120)
    assert result["OL"].iloc[0] == pytest.approx(0.25 * 9120)


def test_an_heir_inherits_only_where_it_stands(tmp_path):
    contest = CONTEST.replace('regions = ["MERE"]', 'regions = ["MERE"]\ninherits = { HU = 0.25 }')
    result = result_of(tmp_path, contest_toml=contest).last_result.set_index("seat")
    assert result.loc["N1", "HU"] == 9120
    assert result.loc["M1", "HU"] == pytest.approx(0.75 * 6120)
    assert result.loc["M1", "OL"] == pytest.approx(5260 + 0.25 * 6120)


@given(votes=st.lists(st.one_of(st.just(math.nan), st.integers(0, 10_000)), min_size=5, max_size=5))
def test_inheriting_moves_votes_and_loses_none(votes, sound_contest):
    cast = dict(zip(("HU", "UP", "OL", "OTH", "RF"), (float(v) for v in votes), strict=True))
    today = inherit(cast, "NORTH", sound_contest)
    total = sum(v for v in cast.values() if not math.isnan(v))
    assert sum(v for v in today.values() if not math.isnan(v)) == pytest.approx(total)


@pytest.fixture(scope="module")
def sound_contest(tmp_path_factory):
    return read(write_folder(tmp_path_factory.mktemp("c") / "c")).contest


def test_seats_and_majority_are_filled_in(tmp_path):
    counting = result_of(tmp_path).contest.counting
    assert (counting.rule, counting.seats, counting.majority) == (CountingRule.PLURALITY, 5, 3)


REGIONS_ALONE = "region,HU,UP,OL,RF,OTH\nNORTH,9120,6310,,1000,880\nMERE,6120,6450,5260,1000,730\n"


def test_one_row_per_region_counts_nothing_in_seats(tmp_path):
    contest = CONTEST.replace('[counting]\nrule = "plurality"\n', "")
    inputs = result_of(tmp_path, contest_toml=contest, result_last_csv=REGIONS_ALONE)
    assert inputs.contest.counting.rule is CountingRule.NONE
    assert inputs.contest.counting.seats is None
    assert list(inputs.last_result["seat"]) == ["", ""]


def test_without_a_last_result_a_contest_of_one_region_can_be_read(tmp_path):
    contest = (
        'title = "Bridge vote"\npolling_day = 2031-05-18\nothers = false\n'
        '[[party]]\ncode = "YES"\nname = "Yes"\n[[party]]\ncode = "NO"\nname = "No"\n'
    )
    polls = "house,end,published,start,sample,YES,NO,undecided\n"
    polls += "Tarrow Research,2031-02-05,2031-02-06,2031-02-01,1000,43,47,10\n"
    inputs = read(write_folder(tmp_path / "c", contest_toml=contest, polls_csv=polls, result_last_csv=None))
    assert inputs.last_result is None
    assert inputs.warnings == ()
    assert list(inputs.polls[["YES", "NO"]].iloc[0]) == pytest.approx([43 / 0.9, 47 / 0.9])
    assert [f.name for f in inputs.files] == ["contest.toml", "polls.csv"]


def test_a_total_is_found_where_the_country_has_no_regions(tmp_path):
    head, tail = CONTEST.split("[[region]]", 1)
    contest = head.replace('regions = ["MERE"]\n', "") + "[last_result]" + tail.split("[last_result]")[1]
    polls = "house,start,end,published,sample,HU,UP,OL,OTH\n"
    polls += "Tarrow Research,2031-02-01,2031-02-05,2031-02-06,1000,40,38,17,5\n"
    result = "seat,HU,UP,OL,RF,OTH\nN1,110,20,50,5,1\nN2,20,110,50,5,1\nAll,130,130,100,10,2\n"
    folder = write_folder(tmp_path / "c", contest_toml=contest, polls_csv=polls, result_last_csv=result)
    assert [(p.row, p.rule.value) for p in findings(folder)] == [(4, "R78")]
