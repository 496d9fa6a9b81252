"""Voting in phases: polls that outlast a region's polling day, counts that come before the others vote."""

from __future__ import annotations

import math
from datetime import date

import pytest

from aggregator.errors import InputError
from tests.inputs.desk_folder import CONTEST, POLLS, RESULT, as_rows, findings, read, workbook, write_folder

FIRST_PHASE = CONTEST.replace('name = "Northern Shore"', 'name = "Northern Shore"\npolling_day = 2031-04-22')
COUNTED = FIRST_PHASE.replace("polling_day = 2031-04-22", "polling_day = 2031-04-22\ncounted = 2031-04-24")
COUNT = """\
seat,name,region,HU,UP,OL,OTH
N1,Northgate,NORTH,9300,7200,,990
N2,Pier Head,NORTH,10900,5300,,870
"""
NORTH = (
    "E-1,Mellow Panel,,2031-04-21,2031-04-23,2031-04-25,,NORTH,900,,online,voters,,40,52,,,8,,,,,{use},,,\n"
)
MERE = "E-1,Mellow Panel,,2031-04-21,2031-04-23,2031-04-25,,MERE,900,,online,voters,,40,32,20,,8,,,,,,,,\n"
WHOLE = "E-1,Mellow Panel,,2031-04-21,2031-04-23,2031-04-25,,,1800,,online,voters,,40,42,10,,8,,,,,,,,\n"


def rules(folder, **kwargs) -> list[tuple[str, int | None, str]]:
    return [(p.severity.value, p.row, p.rule.value) for p in findings(folder, **kwargs)]


class TestPolls:
    def test_a_row_about_a_region_that_has_voted_is_left_out(self, tmp_path):
        folder = write_folder(
            tmp_path / "c", contest_toml=FIRST_PHASE, polls_csv=POLLS + NORTH.format(use="") + MERE
        )
        inputs = read(folder)
        assert list(inputs.unused_polls["why_not"]) == [
            "fieldwork ended on or after polling day (2031-04-22)"
        ]
        assert list(inputs.polls["row"]) == [2, 3, 4, 5, 6, 8]

    def test_at_the_desk_s_word_it_enters_with_a_warning(self, tmp_path):
        folder = write_folder(
            tmp_path / "c", contest_toml=FIRST_PHASE, polls_csv=POLLS + NORTH.format(use="yes")
        )
        assert 7 in list(read(folder).polls["row"])
        assert ("warning", 7, "R69") in rules(folder)

    def test_after_the_last_region_has_voted_nothing_enters(self, tmp_path):
        late = NORTH.format(use="yes").replace("2031-04-23,2031-04-25", "2031-05-19,2031-05-20")
        folder = write_folder(tmp_path / "c", contest_toml=FIRST_PHASE, polls_csv=POLLS + late)
        assert ("error", 7, "R69") in rules(folder, today=date(2031, 6, 1))

    def test_a_poll_of_the_country_enters_and_says_what_is_done_with_the_region(self, tmp_path):
        polls = POLLS.replace("2031-04-20,2031-04-23", "2031-04-16,2031-04-19") + WHOLE
        inputs = read(write_folder(tmp_path / "c", contest_toml=FIRST_PHASE, polls_csv=polls))
        assert 7 in list(inputs.polls["row"])
        assert [str(p) for p in inputs.warnings if p.row == 7] == [
            "polls.csv, row 7, column end: found 2031-04-23, when NORTH (2031-04-22) had voted; expected "
            "fieldwork that ended before a region votes. It enters; a region that has voted is taken as it "
            "stood on its polling day. [R81]"
        ]

    def test_a_breakdown_without_the_region_that_has_voted_gives_way_to_the_whole(self, tmp_path):
        rows = WHOLE + NORTH.format(use="") + MERE
        inputs = read(write_folder(tmp_path / "c", contest_toml=FIRST_PHASE, polls_csv=POLLS + rows))
        last = inputs.polls[inputs.polls["poll"] == "E-1"]
        assert list(last["row"]) == [7]
        assert last["respondents"].sum() == 1800

    def test_all_such_polls_are_gathered_in_one_warning(self, tmp_path):
        later = WHOLE.replace("E-1", "E-2").replace("2031-04-21,2031-04-23", "2031-04-24,2031-04-25")
        folder = write_folder(
            tmp_path / "c", contest_toml=FIRST_PHASE, polls_csv=POLLS + WHOLE + later.replace(",42,", ",41,")
        )
        told = [(p.row, p.found) for p in findings(folder) if p.rule == "R81"]
        assert told == [(6, "2031-04-23, when NORTH (2031-04-22) had voted; likewise in row(s) 7, 8")]

    def test_without_phases_nothing_is_said(self, tmp_path):
        assert rules(write_folder(tmp_path / "c", polls_csv=POLLS + WHOLE)) == []


def counted(tmp_path, text: str = COUNT, **files: str | bytes | None):
    folder = write_folder(tmp_path / "c", contest_toml=COUNTED, **{"result_counted.csv": text}, **files)
    return folder


class TestCounts:
    def test_votes_are_those_of_today_s_parties_in_the_form_of_the_last_result(self, tmp_path):
        inputs = read(counted(tmp_path))
        assert inputs.counted_result is not None
        assert list(inputs.counted_result.columns) == list(inputs.last_result.columns)
        first = inputs.counted_result.iloc[0]
        # The last result gives the Upland Party a part of the Reed Front's votes; a count gives it its own.
        assert (first["seat"], first["region"], first["HU"], first["UP"]) == ("N1", "NORTH", 9300, 7200)
        assert math.isnan(first["OL"])

    def test_the_file_is_copied_and_hashed_with_the_others(self, tmp_path):
        inputs = read(counted(tmp_path))
        assert [f.name for f in inputs.files][-1] == "result_counted.csv"
        assert [f.file for f in inputs.fingerprints] == [f.name for f in inputs.files]

    @pytest.mark.parametrize(("day", "rows"), [(date(2031, 4, 23), None), (date(2031, 4, 24), 2)])
    def test_they_are_not_seen_before_their_day(self, day, rows, tmp_path):
        result = read(counted(tmp_path), as_of=day).counted_result
        assert (None if result is None else len(result)) == rows

    def test_each_region_is_seen_from_its_own_day(self, tmp_path):
        contest = COUNTED.replace(
            "[last_result]",
            '[[region]]\ncode = "FEN"\nname = "Fens"\npolling_day = 2031-04-22\ncounted = 2031-04-28\n\n'
            "[last_result]",
        )
        last = {"result_last.csv": RESULT + "F1,Low Fen,FEN,6120,6450,,1000,730\n"}
        counts = {"result_counted.csv": COUNT + "F1,Low Fen,FEN,6200,7250,,730\n"}
        folder = write_folder(tmp_path / "c", contest_toml=contest, **last, **counts)
        seen = {day: set(read(folder, as_of=date(2031, 4, day)).counted_result["region"]) for day in (27, 28)}
        assert seen == {27: {"NORTH"}, 28: {"NORTH", "FEN"}}

    def test_a_workbook_will_do(self, tmp_path):
        book = workbook([[_number(cell) for cell in row] for row in as_rows(COUNT)], sheet="result")
        folder = write_folder(tmp_path / "c", contest_toml=COUNTED, **{"result_counted.xlsx": book})
        assert read(folder).counted_result["HU"].sum() == 20200

    def test_the_order_of_its_rows_does_not_matter(self, tmp_path):
        header, *rows = COUNT.splitlines(keepends=True)
        turned = read(counted(tmp_path, header + "".join(rows[::-1]))).counted_result
        plain = read(counted(tmp_path)).counted_result
        assert turned.sort_values("seat").reset_index(drop=True).equals(plain)

    def test_everything_wrong_with_it_is_in_one_report(self, tmp_path):
        text = (
            COUNT.replace("N2,", "N9,").replace(",7200,", ",7200.5,")
            + "M1,Mereside,MERE,6000,5000,4000,700\n"
        )
        with pytest.raises(InputError) as caught:
            read(counted(tmp_path, text))
        assert [
            (p.row, p.rule.value) for p in caught.value.problems if p.file == "result_counted.csv"
        ] == [
            (2, "R71"), (2, "R84"), (3, "R84"), (4, "R84"), (4, "R83"),
        ]  # fmt: skip

    def test_where_the_day_of_a_count_cannot_be_read_its_rows_are_not_blamed(self, tmp_path):
        contest = COUNTED.replace("counted = 2031-04-24", 'counted = "in April"')
        folder = write_folder(tmp_path / "c", contest_toml=contest, **{"result_counted.csv": COUNT})
        assert [(p.file, p.rule.value) for p in findings(folder)] == [("contest.toml", "R13")]

    def test_without_a_last_result_any_seats_will_do(self, tmp_path):
        contest = COUNTED.replace('[last_result]\ndate = 2027-05-16\nfile = "result_last.csv"\n', "")
        contest = contest.replace("inherits = { RF = 0.8 }\n", "").replace('"plurality"', '"none"')
        contest = contest.replace("counted =", "electorate = 5\ncounted =")
        contest = contest.replace('name = "Upper Mere"', 'name = "Upper Mere"\nelectorate = 5')
        text = "region,HU,UP,OL,OTH\nNORTH,20200,12500,,1860\n"
        folder = write_folder(
            tmp_path / "c", contest_toml=contest, result_last_csv=None, **{"result_counted.csv": text}
        )
        assert list(read(folder).counted_result["HU"]) == [20200]


def _number(cell: object) -> object:
    return int(cell) if isinstance(cell, str) and cell.isdigit() else cell
