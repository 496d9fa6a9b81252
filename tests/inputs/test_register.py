"""Which rows of the register enter, with how many respondents, and as of when."""

from __future__ import annotations

from datetime import date

import pandas as pd
import pytest

from aggregator.errors import InputError, UsageError
from tests.inputs.desk_folder import CONTEST, POLLS, findings, read, spoilt, write_folder

HEADER = POLLS.splitlines()[0]
M1_NATIONAL = (
    "M-1,Mellow Panel,,2031-03-10,2031-03-13,2031-03-15,,,2000,,online,adults,,37,39,17,,7,,,,,,,,\n"
)
TRACK = "{id},Kestrel Poll,,{start},{end},{end},,,1000,,online,voters,,,39.6,,55.5,4.9,,,,,,,,\n"


def why_not(folder, **kwargs) -> dict[int, str]:
    unused = read(folder, **kwargs).unused_polls
    return dict(zip(unused["row"], unused["why_not"], strict=True))


def used(folder, **kwargs) -> list[int]:
    return list(read(folder, **kwargs).polls["row"])


def test_columns_and_units_of_the_polls_are_as_promised(tmp_path):
    polls = read(write_folder(tmp_path / "c")).polls
    assert list(polls.columns) == [
        "row", "poll", "house", "sponsor", "start", "end", "published", "regions", "sample", "respondents",
        "poll_respondents", "effective", "mode", "population", "method", "undecided", "rounding_step",
        "source", "note", "HU", "UP", "OL", "OTH", "LAKE", "remainder",
    ]  # fmt: skip
    first = polls.iloc[0]
    assert first["regions"] == ("NORTH", "MERE")
    assert (first["sample"], first["respondents"]) == (1012, pytest.approx(910.8))
    assert polls["end"].dtype == "datetime64[ns]"
    assert list(polls["poll_respondents"]) == pytest.approx([910.8, 1540, 2000, 2000, 1495])


def test_regional_rows_that_cover_the_country_enter_instead_of_the_national_one(tmp_path):
    folder = write_folder(tmp_path / "c", polls_csv=POLLS + M1_NATIONAL)
    assert used(folder) == [2, 3, 4, 5, 6]
    assert why_not(folder) == {7: "entered by its regional rows"}


def test_the_national_row_enters_where_regional_ones_leave_regions_out(tmp_path):
    lines = POLLS.splitlines(keepends=True)
    folder = write_folder(tmp_path / "c", polls_csv="".join([*lines[:4], M1_NATIONAL, lines[5]]))
    assert used(folder) == [2, 3, 5, 6]
    assert why_not(folder) == {4: "entered by its national row: the others leave regions out"}


def test_the_national_row_enters_where_only_it_names_every_code(tmp_path):
    text = spoilt("polls.csv", (",27,36,31,,6,", ",27,36,,,37,")) + M1_NATIONAL
    folder = write_folder(tmp_path / "c", polls_csv=text)
    assert used(folder) == [2, 3, 6, 7]
    assert why_not(folder)[5] == "entered by its national row: only that names OL"


def test_members_in_the_regional_rows_stand_for_the_alliance_in_the_national_one(tmp_path):
    folder = write_folder(tmp_path / "c", polls_csv=POLLS + M1_NATIONAL.replace("37,39,17,,7", ",39,,54,7"))
    assert used(folder) == [2, 3, 4, 5, 6]


def test_respondents_of_a_poll_are_counted_once(tmp_path):
    polls = read(write_folder(tmp_path / "c", polls_csv=POLLS + M1_NATIONAL)).polls
    mellow = polls[polls["poll"] == "M-1"]
    assert mellow["respondents"].sum() == 2000
    assert set(mellow["poll_respondents"]) == {2000}


def test_shared_days_of_a_tracking_poll_count_once(tmp_path):
    text = HEADER + "\n"
    for day in (1, 2, 3, 4):
        text += TRACK.format(id=f"K-{day}", start=f"2031-03-0{day}", end=f"2031-03-0{day + 2}")
    inputs = read(write_folder(tmp_path / "c", polls_csv=text))
    assert list(inputs.polls["respondents"]) == pytest.approx([1000, 1000 / 3, 1000 / 3, 1000 / 3])
    assert list(inputs.polls["poll_respondents"]) == pytest.approx([1000, 1000 / 3, 1000 / 3, 1000 / 3])
    overlap = next(p for p in inputs.warnings if p.rule == "R66")
    assert "K-2" in overlap.found
    assert "K-1" in overlap.found
    assert "likewise in row(s) 4, 5" in overlap.found


def test_an_effective_size_shrinks_with_the_respondents(tmp_path):
    text = HEADER + "\n" + TRACK.format(id="K-1", start="2031-03-01", end="2031-03-04")
    later = TRACK.format(id="K-2", start="2031-03-03", end="2031-03-06").replace(",1000,,", ",1000,800,")
    polls = read(write_folder(tmp_path / "c", polls_csv=text + later)).polls
    assert polls["effective"].iloc[1] == pytest.approx(400)
    assert polls["respondents"].iloc[1] == pytest.approx(500)


@pytest.mark.parametrize(
    ("column", "change"),
    [
        ("sponsor", ("Kestrel Poll,,2031-03-03", "Kestrel Poll,Isle Weekly,2031-03-03")),
        ("method", ("2031-03-03,2031-03-06,2031-03-06,,,1000,,online,voters,", "2031-03-03,2031-03-06,"
                    "2031-03-06,,,1000,,online,voters,panel")),
        ("region", ("2031-03-03,2031-03-06,2031-03-06,,", "2031-03-03,2031-03-06,2031-03-06,,NORTH")),
    ],
)  # fmt: skip
def test_other_fieldwork_of_the_same_days_counts_in_full(column, change, tmp_path):
    text = HEADER + "\n" + TRACK.format(id="K-1", start="2031-03-01", end="2031-03-04")
    text += TRACK.format(id="K-2", start="2031-03-03", end="2031-03-06").replace(*change)
    inputs = read(write_folder(tmp_path / "c", polls_csv=text))
    assert list(inputs.polls["respondents"]) == [1000, 1000], column


CORRECTED = spoilt(
    "polls.csv",
    (
        "K-2,Kestrel",
        "K-1b,Kestrel Poll,,2031-02-20,2031-02-23,2031-02-25,,,1540,1210,online,voters,,39.4,37.1,17.9,,5.6,"
        ",,2031-03-20,K-1,,,,\nK-2,Kestrel",
    ),
)


@pytest.mark.parametrize(
    ("day", "expected"),
    [(date(2031, 2, 24), [2]), (date(2031, 3, 19), [2, 3, 4, 5]), (date(2031, 3, 20), [2, 4, 5, 6])],
)
def test_the_register_is_read_as_it_stood(day, expected, tmp_path):
    folder = write_folder(tmp_path / "c", polls_csv=CORRECTED)
    inputs = read(folder, as_of=day)
    assert list(inputs.polls["row"]) == expected
    assert inputs.run_date == day
    assert len(inputs.polls) + len(inputs.unused_polls) == 6


def test_a_correction_names_itself_and_its_day(tmp_path):
    folder = write_folder(tmp_path / "c", polls_csv=CORRECTED)
    assert why_not(folder) == {3: "corrected by K-1b from 2031-03-20 on"}
    before = why_not(folder, as_of=date(2031, 3, 19))
    assert before == {
        6: "corrects K-1 from 2031-03-20 on, after 2031-03-19",
        7: "published on 2031-04-25, after 2031-03-19",
    }


def test_a_withdrawn_poll_stood_until_its_day(tmp_path):
    text = spoilt("polls.csv", (",5.6,,,,,,,,", ",5.6,,withdrawn,2031-03-20,,,,,"))
    folder = write_folder(tmp_path / "c", polls_csv=text)
    assert 3 in used(folder, as_of=date(2031, 3, 19))
    assert why_not(folder, as_of=date(2031, 3, 20))[3] == "withdrawn on 2031-03-20"
    assert why_not(folder)[3] == "withdrawn on 2031-03-20"


def test_a_later_poll_teaches_nothing_about_an_earlier_day(tmp_path):
    early = spoilt("polls.csv", (",38.4,38.1,17.9,,5.6,", ",38,38,18,,6,"))
    alone = "".join(early.splitlines(keepends=True)[:6])
    later = (
        alone
        + "K-3,Kestrel Poll,,2031-04-26,2031-04-27,2031-04-28,,,900,,online,voters,,,39.6,,,60.4,,,,,,,,\n"
    )
    day = date(2031, 4, 25)
    with_later = read(write_folder(tmp_path / "a", polls_csv=later), as_of=day)
    without = read(write_folder(tmp_path / "b", polls_csv=alone), as_of=day)
    pd.testing.assert_frame_equal(with_later.polls, without.polls)


def test_what_is_left_out_is_listed_with_its_reason(tmp_path):
    text = POLLS + (
        "X-1,Kestrel Poll,,2031-04-01,2031-04-02,2031-04-03,exit,,900,,online,voters,,40,40,12,,8,,,,,,,,\n"
        "X-2,Click Ballot,,2031-04-01,2031-04-02,2031-04-03,,,,,online,all,,40,40,12,,8,,,,,no,no sample,,\n"
        "X-3,Kestrel Poll,,2031-04-01,2031-04-02,2031-04-03,seats_only,,,,,,,110,105,,,12,,,,,,,,\n"
    )
    folder = write_folder(tmp_path / "c", polls_csv=text)
    assert used(folder) == [2, 3, 4, 5, 6]
    assert why_not(folder) == {7: "question: exit", 8: "no sample", 9: "question: seats_only"}


def test_fieldwork_that_ends_on_polling_day_is_left_out_unless_the_desk_says_so(tmp_path):
    row = (
        "E-1,Kestrel Poll,,2031-05-18,2031-05-18,2031-05-18,,,900,,online,voters,,40,40,12,,8,,,,,{use},,,\n"
    )
    after = date(2031, 6, 1)
    left_out = write_folder(tmp_path / "a", polls_csv=POLLS + row.format(use=""))
    taken = write_folder(tmp_path / "b", polls_csv=POLLS + row.format(use="yes"))
    assert why_not(left_out, today=after) == {7: "fieldwork ended on or after polling day (2031-05-18)"}
    assert 7 in used(taken, today=after)


def test_a_region_that_votes_first_has_its_own_last_day(tmp_path):
    contest = CONTEST.replace('name = "Northern Shore"', 'name = "Northern Shore"\npolling_day = 2031-04-21')
    row = "E-1,Kestrel Poll,,2031-04-19,2031-04-21,2031-04-23,,NORTH,900,,online,voters,,40,52,,,8,,,,,,,,\n"
    folder = write_folder(tmp_path / "c", contest_toml=contest, polls_csv=POLLS + row)
    assert why_not(folder) == {7: "fieldwork ended on or after polling day (2031-04-21)"}


class TestRunDay:
    def test_in_a_contest_under_way_it_is_today(self, tmp_path):
        assert read(write_folder(tmp_path / "c"), today=date(2031, 4, 30)).run_date == date(2031, 4, 30)

    def test_after_the_contest_it_is_the_last_publication(self, tmp_path):
        assert read(write_folder(tmp_path / "c"), today=date(2032, 1, 1)).run_date == date(2031, 4, 25)

    def test_before_an_invented_contest_it_is_the_last_publication(self, tmp_path):
        assert read(write_folder(tmp_path / "c"), today=date(2026, 1, 1)).run_date == date(2031, 4, 25)

    def test_it_never_lies_after_polling_day(self, tmp_path):
        late = spoilt("polls.csv", ("2031-04-25", "2031-05-30"))
        inputs = read(write_folder(tmp_path / "c", polls_csv=late), today=date(2032, 1, 1))
        assert (inputs.run_date, inputs.unpublished) == (date(2031, 5, 18), ())

    def test_a_poll_under_embargo_is_used_and_named(self, tmp_path):
        inputs = read(write_folder(tmp_path / "c"), today=date(2031, 4, 24))
        assert inputs.unpublished == ("K-2",)
        assert 6 in list(inputs.polls["row"])

    def test_as_of_sees_no_poll_under_embargo(self, tmp_path):
        inputs = read(write_folder(tmp_path / "c"), as_of=date(2031, 4, 24), today=date(2031, 4, 24))
        assert inputs.unpublished == ()
        assert 6 not in list(inputs.polls["row"])

    def test_as_of_after_polling_day_is_wrong_usage(self, tmp_path):
        with pytest.raises(UsageError, match="--as-of 2031-05-19 lies after polling day"):
            read(write_folder(tmp_path / "c"), as_of=date(2031, 5, 19))

    def test_as_of_before_the_first_poll_is_an_error(self, tmp_path):
        with pytest.raises(InputError, match="no poll that can be used on 2031-01-01"):
            read(write_folder(tmp_path / "c"), as_of=date(2031, 1, 1))


def test_blank_identifiers_are_made_from_house_and_end(tmp_path):
    text = POLLS.replace("\nK-1,", "\n,").replace("\nT-1,", "\n,")
    polls = read(write_folder(tmp_path / "c", polls_csv=text)).polls
    assert list(polls["poll"])[:2] == ["tarrow-research-2031-02-05", "kestrel-poll-2031-02-23"]


def test_a_made_identifier_can_be_corrected(tmp_path):
    text = (
        CORRECTED.replace("\nK-1,", "\n,")
        .replace("\nK-1b,", "\n,")
        .replace(",K-1,", ",kestrel-poll-2031-02-23,")
    )
    folder = write_folder(tmp_path / "c", polls_csv=text)
    assert why_not(folder) == {
        3: "corrected by kestrel-poll-2031-02-23-corrected-2031-03-20 from 2031-03-20 on"
    }


def test_hypothetical_questions_may_imagine_what_does_not_exist(tmp_path):
    contest = CONTEST.replace("from = 2031-01-15", "from = 2031-04-15")
    row = "H-1,Kestrel Poll,,2031-03-01,2031-03-02,,hypothetical,NORTH,900,,online,voters,,,40,,60,,,,,,,,,\n"
    assert findings(write_folder(tmp_path / "c", contest_toml=contest, polls_csv=POLLS + row)) == ()


def test_a_contest_without_regions_is_one_country(tmp_path):
    head, tail = CONTEST.split("[[region]]", 1)
    contest = head.replace('regions = ["MERE"]\n', "") + "[last_result]" + tail.split("[last_result]")[1]
    polls = "house,end,sample,HU,UP,OL\nTarrow Research,2031-02-05,1000,40,38,17\n"
    result = "seat,HU,UP,OL,RF,OTH\nN1,10,20,5,5,1\nN2,20,10,5,5,1\n"
    folder = write_folder(tmp_path / "c", contest_toml=contest, polls_csv=polls, result_last_csv=result)
    inputs = read(folder)
    assert list(inputs.polls["regions"]) == [("ALL",)]
    assert set(inputs.last_result["region"]) == {"ALL"}
    assert {p.rule.value for p in inputs.warnings} == {"R60", "R61"}


def test_as_of_a_day_the_contest_is_what_could_be_written_then(tmp_path):
    phases = 'name = "Northern Shore"\npolling_day = 2031-05-04\ncounted = 2031-05-08\n'
    contest = CONTEST.replace('name = "Northern Shore"\n', phases).replace(
        "from = 2031-01-15", "from = 2031-01-15\nuntil = 2031-04-30"
    )
    contest += "\n[[jolt]]\ndate = 2031-02-03\n\n[[jolt]]\ndate = 2031-04-07\n"
    counted = "seat,region,HU,UP,OTH\nN1,NORTH,9000,7000,900\nN2,NORTH,9900,5000,800\n"
    folder = write_folder(tmp_path / "c", contest_toml=contest, result_counted_csv=counted)

    def known(day: date | None) -> tuple[list[int], list[date | None], date | None]:
        contest = read(folder, as_of=day).contest
        return (
            [j.date.month for j in contest.jolts],
            [a.until for a in contest.alliances],
            contest.regions[0].counted,
        )

    whole = ([2, 4], [date(2031, 4, 30)], date(2031, 5, 8))
    assert known(None) == known(date(2031, 5, 8)) == whole
    assert known(date(2031, 4, 6)) == ([2], [None], None)
    assert known(date(2031, 4, 29)) == ([2, 4], [None], None)


def test_as_of_a_day_no_later_alliance_is_known(tmp_path):
    polls = "house,end,sample,HU,UP,OL\nTarrow Research,2031-01-05,1000,40,38,17\n"
    folder = write_folder(tmp_path / "c", polls_csv=polls)
    before, after = (read(folder, as_of=date(2031, 1, day)) for day in (14, 15))
    assert (before.contest.alliances, "LAKE" in before.polls) == ((), False)
    assert ([a.code for a in after.contest.alliances], "LAKE" in after.polls) == (["LAKE"], True)
