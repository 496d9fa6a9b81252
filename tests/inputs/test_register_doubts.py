"""Doubts about figures and labels: what a desk is told to look at twice, and what it is spared."""

from __future__ import annotations

import pytest

from tests.inputs.desk_folder import CONTEST, POLLS, findings, read, spoilt, write_folder

WITHOUT_LAST = (
    CONTEST.replace('[last_result]\ndate = 2027-05-16\nfile = "result_last.csv"\n', "")
    .replace("inherits = { RF = 0.8 }\n", "")
    .replace('"plurality"', '"none"')
    .replace('name = "Northern Shore"', 'name = "Northern Shore"\nelectorate = 5')
    .replace('name = "Upper Mere"', 'name = "Upper Mere"\nelectorate = 5')
)
DAYS = "2031-04-26,2031-04-27,2031-04-28"
ROW = f"X-1,Kestrel Poll,,{DAYS},,{{region}},900,,online,voters,{{method}},{{figures}},,,,,,,\n"


def told(tmp_path, *, last: bool = True, **files: str) -> list[tuple[int | None, str]]:
    contest = {} if last else {"contest_toml": WITHOUT_LAST, "result_last_csv": None}
    return [(p.row, p.rule.value) for p in findings(write_folder(tmp_path / "c", **(contest | files)))]


def register(figures: str, *, region: str = "", method: str = "") -> str:
    return POLLS + ROW.format(figures=figures, region=region, method=method)


class TestRemainder:
    def test_refusals_left_in_it_are_found_by_the_last_result(self, tmp_path):
        assert told(tmp_path, polls_csv=register("33,32,15,,,")) == [(7, "R49")]

    def test_refusals_left_in_it_are_found_by_other_polls_where_there_is_no_last_result(self, tmp_path):
        assert told(tmp_path, last=False, polls_csv=register("33,32,15,,,")) == [(7, "R49")]

    def test_a_party_not_asked_may_be_in_it(self, tmp_path):
        # 18 for the Orchard League, as other polls have it, and 6 for others.
        assert told(tmp_path, last=False, polls_csv=register("38,38,,,,")) == []

    def test_refusals_beside_a_party_not_asked_are_found_too(self, tmp_path):
        assert told(tmp_path, last=False, polls_csv=register("29,30,,,,")) == [(7, "R49")]

    def test_a_regional_stronghold_is_held_to_polls_of_its_region(self, tmp_path):
        # 31 for the Orchard League there, though never above 18 in the country.
        assert told(tmp_path, last=False, polls_csv=register("28,35,,,,", region="MERE")) == []

    def test_nothing_is_said_where_no_one_knows(self, tmp_path):
        polls = "house,start,end,published,sample,HU,UP\n"
        polls += "Tarrow Research,2031-02-01,2031-02-05,2031-02-06,1000,35,30\n"
        assert told(tmp_path, last=False, polls_csv=polls) == [(1, "R79")]


class TestUndecided:
    @pytest.mark.parametrize(("undecided", "warned"), [("40", False), ("41", True)])
    def test_more_than_forty_percent_are_looked_at_twice(self, undecided, warned, tmp_path):
        text = spoilt("polls.csv", (",34,33,16,,7,10,", f",22,20,12,,5,{undecided},"))
        assert told(tmp_path, polls_csv=text) == ([(2, "R96")] if warned else [])

    def test_they_are_no_respondents_of_the_fit(self, tmp_path):
        text = spoilt("polls.csv", (",1012,,", ",1000,800,"), (",34,33,16,,7,10,", ",20,18,10,,4,48,"))
        first = read(write_folder(tmp_path / "c", polls_csv=text)).polls.iloc[0]
        assert (first["respondents"], first["effective"]) == pytest.approx((520, 416))
        assert first[["HU", "UP", "OL", "OTH"]].sum() == pytest.approx(100)


class TestMethodLabels:
    def test_one_house_may_call_its_ways_as_it_likes(self, tmp_path):
        text = spoilt("polls.csv", ("1495,,online,voters,,", "1495,,online,voters,panel 2031,"))
        assert told(tmp_path, polls_csv=text) == []

    def test_a_label_after_polls_without_one_starts_an_era_without_a_word(self, tmp_path):
        assert told(tmp_path, polls_csv=register("39,38,17.5,,5.5,", method="panel 2031")) == []

    def test_blanks_after_a_label_are_said_once_for_a_house(self, tmp_path):
        text = spoilt("polls.csv", ("1540,1210,online,voters,,", "1540,1210,online,voters,panel 2029,"))
        text += ROW.format(figures="39,38,17.5,,5.5,", region="", method="")
        found = findings(write_folder(tmp_path / "c", polls_csv=text))
        assert [(p.row, p.rule.value) for p in found] == [(6, "R93")]
        assert found[0].found == 'a blank cell in rows 6, 7, after "panel 2029" in row 3'

    def test_a_word_that_two_houses_use_is_pointed_to_the_mode_column(self, tmp_path):
        text = POLLS.replace("online,voters,,", "online,voters,web panel,")
        text = text.replace("phone,voters,,", "phone,voters,web panel,")
        found = findings(write_folder(tmp_path / "c", polls_csv=text))
        assert [(p.row, p.rule.value) for p in found] == [(2, "R92")]
        assert "write it in mode" in found[0].remedy


class TestTargetPopulation:
    ADULTS = POLLS.replace(",voters,", ",adults,")

    def test_a_register_without_it_is_told_its_labels(self, tmp_path):
        found = findings(write_folder(tmp_path / "c", polls_csv=self.ADULTS))
        assert [(p.file, p.column, p.rule.value) for p in found] == [
            ("contest.toml", "model.target_population", "R97")
        ]
        assert "the register says adults" in found[0].found

    def test_naming_it_in_the_contest_settles_it(self, tmp_path):
        contest = CONTEST + '\n[model]\ntarget_population = "adults"\n'
        assert told(tmp_path, polls_csv=self.ADULTS, contest_toml=contest) == []

    def test_a_register_without_labels_needs_none(self, tmp_path):
        polls = POLLS.replace(",voters,", ",,").replace(",adults,", ",,")
        assert told(tmp_path, polls_csv=polls) == []

    def test_a_slip_is_answered_with_the_label_that_is_meant(self, tmp_path):
        contest = CONTEST + '\n[model]\ntarget_population = "Voters"\n'
        found = findings(write_folder(tmp_path / "c", contest_toml=contest))
        assert found[0].remedy.startswith('Did you mean "voters"?')
