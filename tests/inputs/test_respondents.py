"""One respondent, counted once: whatever the register lists, the respondents that enter add up to people."""

from __future__ import annotations

import random
from dataclasses import replace
from datetime import date, timedelta

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.register_columns import Question, Status
from aggregator.inputs.tracking_windows import check_listed_twice, check_windows, regions_by_poll
from tests.inputs.desk_folder import CONTEST, POLLS, TODAY, findings, read, write_folder

HEADER = POLLS.splitlines()[0]
FIRST_DAY = date(2031, 3, 1)
FULL, ALLIANCE = "38.4,38.1,17.9,,5.6", ",39.6,,55.5,4.9"


def row(
    poll: str, start: str, end: str, *, sample: int = 900, figures: str = FULL, region: str = "",
    question: str = "", sponsor: str = "", mode: str = "online", population: str = "voters",
    method: str = "", undecided: str = "", rest: str = ",,,,,,",
) -> str:  # fmt: skip
    """One row of the register in March 2031: days as ``01`` … ``31``."""
    days = f"2031-03-{start},2031-03-{end},2031-03-{end}"
    cells = f"{days},{question},{region},{sample},,{mode},{population},{method},{figures},{undecided}"
    return f"{poll},Kestrel Poll,{sponsor},{cells},{rest}\n"


def respondents(tmp_path, *rows: str, today: date = TODAY, contest: str = CONTEST) -> dict[str, float]:
    """Respondents that enter, by poll; read with the rows in this order and in another."""
    found = []
    for name, ordered in (("plain", rows), ("turned", rows[::-1])):
        text = HEADER + "\n" + "".join(ordered)
        polls = read(write_folder(tmp_path / name, polls_csv=text, contest_toml=contest), today=today).polls
        found.append(polls.groupby("poll")["respondents"].sum().to_dict())
    assert found[0] == pytest.approx(found[1])
    return found[0]


class TestRollingTracker:
    def test_respondents_are_the_interviews_of_all_its_days(self, tmp_path):
        waves = [
            row(f"K-{d}", f"{d:02}", f"{d + 2:02}", figures=f"{38 + d / 10},38,17.9,,5.6")
            for d in range(1, 9)
        ]
        found = respondents(tmp_path, *waves)
        assert found["K-1"] == pytest.approx(900)
        assert found["K-2"] == pytest.approx(300)
        assert sum(found.values()) == pytest.approx(10 * 300)

    def test_three_windows_on_one_day_count_that_day_once(self, tmp_path):
        found = respondents(
            tmp_path,
            row("A", "01", "05", sample=500),
            row("B", "03", "07", sample=500, figures=ALLIANCE),
            row("C", "05", "09", sample=500, figures="37,39,18,,6"),
        )
        assert found == pytest.approx({"A": 500, "B": 200, "C": 200})

    def test_a_window_inside_another_keeps_its_days(self, tmp_path):
        found = respondents(
            tmp_path,
            row("wide", "01", "10", sample=1000),
            row("inside", "04", "06", sample=300, figures=ALLIANCE),
        )
        assert found == pytest.approx({"inside": 300, "wide": 700})

    def test_of_two_that_end_together_the_longer_keeps_its_own_days(self, tmp_path):
        found = respondents(
            tmp_path,
            row("wide", "01", "10", sample=1000),
            row("late", "08", "10", sample=300, figures=ALLIANCE),
        )
        assert found == pytest.approx({"late": 300, "wide": 700})

    def test_windows_that_share_one_day_count_it_once(self, tmp_path):
        found = respondents(
            tmp_path, row("A", "01", "04", sample=400), row("B", "04", "07", sample=400, figures=ALLIANCE)
        )
        assert found == pytest.approx({"A": 400, "B": 300})

    def test_a_summary_of_waves_leaves_nothing_and_is_an_error(self, tmp_path):
        text = HEADER + "\n" + row("A", "01", "03") + row("B", "04", "06", figures=ALLIANCE)
        text += row("both", "01", "06", figures="38,39,17,,6")
        found = findings(write_folder(tmp_path / "c", polls_csv=text))
        assert [(p.row, p.rule.value) for p in found] == [(4, "R67")]

    def test_a_wave_whose_national_row_gives_way_to_its_regions_stays_in_the_series(self, tmp_path):
        found = respondents(
            tmp_path,
            row("A", "01", "03"),
            row("B", "02", "04", figures=ALLIANCE),
            row("B", "02", "04", sample=400, region="NORTH", figures="50,42,,,8"),
            row("B", "02", "04", sample=500, region="MERE", figures=",36,,58,6"),
        )
        assert found == pytest.approx({"A": 900, "B": 300})

    def test_a_wave_after_a_region_has_voted_stays_in_the_series(self, tmp_path):
        contest = CONTEST.replace(
            'name = "Northern Shore"', 'name = "Northern Shore"\npolling_day = 2031-03-04'
        )
        north, mere = (
            {"region": "NORTH", "figures": "50,42,,,8"},
            {"region": "MERE", "figures": "27,36,31,,6"},
        )
        found = respondents(
            tmp_path,
            row("A", "01", "03", sample=300, **north),
            row("A", "01", "03", sample=600, **mere),
            row("B", "02", "04", sample=300, **north),
            row("B", "02", "04", sample=600, **mere),
            contest=contest,
        )  # fmt: skip
        assert found == pytest.approx({"A": 900, "B": 200})

    def test_undecided_and_shared_days_both_reduce_the_respondents(self, tmp_path):
        found = respondents(
            tmp_path, row("A", "01", "03"),
            row("B", "02", "04", figures="30,30,15,,5", undecided="20"),
        )  # fmt: skip
        assert found == pytest.approx({"A": 900, "B": 900 * 0.8 / 3})


class TestOnePoll:
    def test_a_breakdown_that_covers_the_country_counts_instead_of_the_whole(self, tmp_path):
        found = respondents(
            tmp_path, row("A", "01", "03", sample=1000, figures="37,39,17,,7"),
            row("A", "01", "03", sample=450, region="NORTH", figures="50,42,,,8"),
            row("A", "01", "03", sample=550, region="MERE", figures="27,36,31,,6"),
        )  # fmt: skip
        assert found == {"A": 1000}

    def test_a_breakdown_of_some_regions_counts_for_nothing_beside_the_whole(self, tmp_path):
        rows = [
            row("A", "01", "03", sample=1000, figures="37,39,17,,7"),
            row("A", "01", "03", sample=550, region="MERE", figures="27,36,31,,6"),
        ]
        assert respondents(tmp_path, *rows) == {"A": 1000}
        unused = read(write_folder(tmp_path / "c", polls_csv=HEADER + "\n" + "".join(rows))).unused_polls
        assert list(unused["why_not"]) == ["entered by its national row: the others leave regions out"]

    def test_two_questions_put_to_the_same_people_count_them_once(self, tmp_path):
        found = respondents(
            tmp_path, row("A", "01", "03", sample=1000),
            row("A", "01", "03", sample=1000, question="hypothetical", figures=",41,,54,5"),
        )  # fmt: skip
        assert found == {"A": 1000}

    def test_another_question_under_its_own_identifier_takes_no_days(self, tmp_path):
        found = respondents(
            tmp_path, row("A", "01", "03", sample=1000),
            row("A-recall", "01", "03", sample=1000, question="recall"),
        )  # fmt: skip
        assert found == {"A": 1000}

    def test_a_correction_counts_in_place_of_what_it_corrects(self, tmp_path):
        found = respondents(
            tmp_path, row("A", "01", "03", sample=1000),
            row("A2", "01", "03", sample=1010, rest=",2031-03-09,A,,,,"),
        )  # fmt: skip
        assert found == {"A2": 1010}

    def test_the_replacement_of_a_withdrawn_poll_counts_alone(self, tmp_path):
        rows = [
            row("A", "01", "03", sample=1000, rest="withdrawn,2031-03-06,,,,,"),
            row("A2", "01", "03", sample=1000, figures="37,39,18,,6", rest=",2031-03-09,A,,,,"),
        ]
        assert respondents(tmp_path, *rows) == {"A2": 1000}
        folder = write_folder(tmp_path / "c", polls_csv=POLLS + "".join(rows))
        seen = {
            day: [p for p in read(folder, as_of=date(2031, 3, day)).polls["poll"] if p.startswith("A")]
            for day in (5, 7, 9)
        }
        assert seen == {5: ["A"], 7: [], 9: ["A2"]}


class TestListedTwice:
    CELLS = pytest.mark.parametrize(
        "cells", [{"sponsor": "Isle Weekly"}, {"mode": "phone"}, {"mode": ""}, {"method": "panel 2029"},
                  {"population": "adults"}, {"figures": "38.4,38.1,17.9,,"}],
        ids=str,
    )  # fmt: skip

    @CELLS
    def test_whatever_the_other_cells_say_it_is_an_error(self, cells, tmp_path):
        text = HEADER + "\n" + row("A", "01", "03") + row("again", "01", "03", **cells)
        found = findings(write_folder(tmp_path / "c", polls_csv=text))
        assert [(p.row, p.rule.value) for p in found] == [(3, "R94")]

    def test_it_is_found_where_one_listing_has_a_breakdown(self, tmp_path):
        text = HEADER + "\n" + row("A", "01", "03", figures="37,39,17,,7")
        text += row("A", "01", "03", sample=400, region="NORTH", figures="50,42,,,8")
        text += row("A", "01", "03", sample=500, region="MERE", figures="27,36,31,,6")
        text += row("again", "01", "03", figures="37,39,17,,7", sponsor="Isle Weekly")
        found = findings(write_folder(tmp_path / "c", polls_csv=text))
        assert [(p.row, p.rule.value) for p in found] == [(5, "R94")]

    @pytest.mark.parametrize(
        "cells", [{"sample": 901}, {"figures": "38.5,38,17.9,,5.6"}, {"region": "MERE"}], ids=str
    )
    def test_other_people_asked_for_another_sponsor_count_in_full(self, cells, tmp_path):
        other = row("B", "01", "03", sponsor="Isle Weekly", **cells)
        assert sum(respondents(tmp_path, row("A", "01", "03"), other).values()) in (1800, 1801)

    def test_a_listing_that_is_left_out_in_the_open_is_no_error(self, tmp_path):
        again = row("again", "01", "03", sponsor="Isle Weekly", rest=",,,no,a second listing of A,,")
        assert respondents(tmp_path, row("A", "01", "03"), again) == {"A": 900}


def test_a_regional_poll_on_the_days_of_a_national_one_is_pointed_out(tmp_path):
    text = HEADER + "\n" + row("A", "01", "03") + row("A-mere", "03", "05", sample=400, region="MERE")
    inputs = read(write_folder(tmp_path / "c", polls_csv=text))
    assert list(inputs.polls["respondents"]) == [900, 400]
    assert [(p.row, p.rule.value) for p in inputs.warnings] == [(3, "R95")]
    assert (
        "A-mere in MERE, where A (row 2) asked from 2031-03-03 to 2031-03-03 too" in inputs.warnings[0].found
    )


DAILY = 100


def wave(number: int, start: int, length: int) -> PollRow:
    """A poll of a tracker with as many interviews every day."""
    first = FIRST_DAY + timedelta(days=start)
    last = first + timedelta(days=length - 1)
    return PollRow(
        row=number + 2, poll=f"K-{number}", house="Kestrel Poll", sponsor="", start=first, end=last,
        published=last, question=Question.VOTE, regions=("ALL",), national=True, sample=DAILY * length,
        effective=None, mode="", population="", method="", shares={"HU": 40.0 + number, "UP": 30.0},
        undecided=None, status=Status.FINAL, status_date=None, replaces="", use=None, why_not="",
        source="", note="", start_given=True, published_given=True,
    )  # fmt: skip


WINDOWS = st.lists(st.tuples(st.integers(0, 40), st.integers(1, 15)), min_size=1, max_size=12, unique=True)


@given(windows=WINDOWS, seed=st.integers(0, 1000))
def test_any_windows_of_a_tracker_sum_to_the_interviews_made_in_any_order(windows, seed):
    waves = [wave(i, start, length) for i, (start, length) in enumerate(windows)]
    kept, problems = check_windows(waves, asked_in=regions_by_poll(waves), file="polls.csv")
    turned = list(waves)
    random.Random(seed).shuffle(turned)
    assert check_windows(turned, asked_in=regions_by_poll(turned), file="polls.csv")[0] == kept
    days = {start + i for start, length in windows for i in range(length)}
    counted = sum((row.sample or 0) * kept.get(row.poll, 1.0) for row in waves)
    assert counted == pytest.approx(DAILY * len(days))
    # A window of which nothing is left is refused, so that no row of zero respondents reaches the model.
    spent = {p.row for p in problems if p.rule == "R67"}
    assert spent == {row.row for row in waves if kept.get(row.poll) == 0}


@given(windows=WINDOWS, twice=st.integers(0, 11), sponsor=st.sampled_from(["", "Isle Weekly"]))
def test_a_second_listing_is_found_among_any_waves(windows, twice, sponsor):
    assume(twice < len(windows))
    waves = [wave(i, start, length) for i, (start, length) in enumerate(windows)]
    assert check_listed_twice(waves, file="polls.csv") == []
    first = waves[twice]
    again = replace(first, poll="again", row=99, sponsor=sponsor)
    assert [p.row for p in check_listed_twice([again, *waves], file="polls.csv")] == [99]
