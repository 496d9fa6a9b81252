"""Who stands where at the coming election, as it was known on the day of the run."""

from __future__ import annotations

from datetime import date

import pandas as pd
import pytest

from tests.inputs.desk_folder import CONTEST, POLLS, RESULT, as_rows, findings, read, workbook, write_folder

HEADER = "seat,code,name,holder,status,status_date,note\n"
LIST = (
    HEADER
    + """\
N1,HU,Ada Brae,yes,,,
N1,UP,Tam Orrin,no,standing,,
N1,OTH,Ilse Morrow,,,,
N1,OTH,,,,,
M1,HU,,,,,
M1,OL,Wim Sallow,yes,withdrawn,2031-04-02,ill
M1,OL,Nell Hythe,,,2031-04-02,
"""
)


def folder_with(tmp_path, text: str | bytes, **files: str | bytes | None):
    return write_folder(tmp_path / "c", **{"candidates.csv": text}, **files)


def rules(tmp_path, text: str | bytes, **files: str) -> list[tuple[str, int | None, str]]:
    return [(p.severity.value, p.row, p.rule.value) for p in findings(folder_with(tmp_path, text, **files))]


def test_those_who_stand_are_listed_in_the_order_of_the_file(tmp_path):
    inputs = read(folder_with(tmp_path, LIST))
    assert list(inputs.candidates.columns) == ["seat", "code", "name", "holder"]
    assert inputs.candidates["holder"].dtype == bool
    assert inputs.candidates.to_numpy().tolist() == [
        ["N1", "HU", "Ada Brae", True],
        ["N1", "UP", "Tam Orrin", False],
        ["N1", "OTH", "Ilse Morrow", False],
        ["N1", "OTH", "", False],
        ["M1", "HU", "", False],
        ["M1", "OL", "Nell Hythe", False],
    ]
    assert inputs.warnings == ()


def test_seat_and_party_are_enough(tmp_path):
    candidates = read(folder_with(tmp_path, "code,seat\nUP,N1\nHU,N1\n")).candidates
    assert candidates.to_numpy().tolist() == [["N1", "UP", "", False], ["N1", "HU", "", False]]


def test_without_the_file_nobody_is_listed(tmp_path):
    assert read(write_folder(tmp_path / "c")).candidates is None


def test_a_workbook_will_do(tmp_path):
    book = workbook(as_rows(LIST), sheet="candidates", others=("notes",))
    assert len(read(write_folder(tmp_path / "c", **{"candidates.xlsx": book})).candidates) == 6


def test_a_seat_with_a_number_for_a_label_is_found_in_a_workbook(tmp_path):
    numbered = RESULT.replace("N1,", "1,").replace("N2,", "2,")
    book = workbook([["seat", "code"], [1, "HU"], [1, "UP"]])
    folder = write_folder(tmp_path / "c", result_last_csv=numbered, **{"candidates.xlsx": book})
    assert list(read(folder).candidates["seat"]) == ["1", "1"]


def test_the_file_is_copied_and_hashed_with_the_others(tmp_path):
    inputs = read(folder_with(tmp_path, LIST))
    assert [f.name for f in inputs.files][-1] == "candidates.csv"
    assert [f.file for f in inputs.fingerprints] == [f.name for f in inputs.files]


@pytest.mark.parametrize(
    ("day", "name"), [(date(2031, 4, 1), "Wim Sallow"), (date(2031, 4, 2), "Nell Hythe")]
)
def test_a_withdrawal_and_a_replacement_are_seen_from_their_day_on(day, name, tmp_path):
    candidates = read(folder_with(tmp_path, LIST), as_of=day).candidates
    assert list(candidates.loc[candidates["code"] == "OL", "name"]) == [name]


def test_a_seat_of_which_nobody_was_known_is_not_named(tmp_path):
    text = HEADER + "N1,HU,,,,2031-04-01,\nN1,UP,,,,2031-04-01,\nM1,HU,,,,,\nM1,OL,,,,,\n"
    assert set(read(folder_with(tmp_path, text), as_of=date(2031, 3, 31)).candidates["seat"]) == {"M1"}
    only_later = HEADER + "N1,HU,,,,2031-04-01,\nN1,UP,,,,2031-04-01,\n"
    assert read(folder_with(tmp_path, only_later), as_of=date(2031, 3, 31)).candidates is None


def test_what_is_doubtful_is_said_of_the_day_of_the_run(tmp_path):
    text = HEADER + "N1,HU,,,,,\nN1,UP,,,withdrawn,2031-04-02,\n"
    assert [p.rule.value for p in read(folder_with(tmp_path, text), as_of=date(2031, 4, 2)).warnings] == [
        "R115"
    ]
    assert read(folder_with(tmp_path, text), as_of=date(2031, 4, 1)).warnings == ()


def test_a_district_may_have_several_candidates_and_members_of_a_party(tmp_path):
    districts = (
        "seat,name,region,seats,HU,UP,OL,RF,OTH\nN,North,NORTH,8,9120,6310,,1000,880\n"
        "M1,Mereside,MERE,5,6120,6450,5260,1000,730\nM2,Old Orchard,MERE,4,4890,5310,8120,1100,640\n"
    )
    text = HEADER + "M2,HU,Ada Brae,yes,,,\nM2,HU,Tam Orrin,yes,,,\nM2,OL,,yes,,,\nM2,OL,,yes,,,\n"
    contest = CONTEST.replace('"plurality"', '"highest_averages"')
    inputs = read(folder_with(tmp_path, text, contest_toml=contest, result_last_csv=districts))
    assert list(inputs.candidates["holder"]) == [True] * 4
    assert inputs.warnings == ()


def test_the_member_may_change_between_elections(tmp_path):
    text = HEADER + (
        "N1,HU,Ada Brae,yes,withdrawn,2031-03-02,died\nN1,UP,Tam Orrin,yes,,2031-03-02,won the by-election\n"
        "N1,HU,,,,2031-03-02,\n"
    )
    assert rules(tmp_path, text) == []


SEATS = {"N1": "NORTH", "N2": "NORTH", "M1": "MERE", "M2": "MERE", "M3": "MERE"}


def slate(*, without: str, seats: tuple[str, ...] = tuple(SEATS)) -> str:
    """Candidates of every party but one in some seats."""
    return HEADER + "".join(
        f"{seat},{code},,,,,\n"
        for seat in seats
        for code in ("HU", "UP", "OL")
        if code != without and (code != "OL" or SEATS[seat] == "MERE")
    )


def told_nowhere(tmp_path, text: str, **files: str) -> list[str]:
    """Kinds of the findings that a party stands nowhere."""
    return [kind for kind, _, rule in rules(tmp_path, text, **files) if rule == "R114"]


@pytest.mark.parametrize("code", ["UP", "OL"])
def test_a_party_stands_in_seats_that_are_not_named(code, tmp_path):
    assert told_nowhere(tmp_path, slate(without=code)) == ["error"]
    assert told_nowhere(tmp_path, slate(without=code, seats=("N1", "N2", "M1", "M2"))) == []


def test_a_party_that_no_poll_names_may_have_no_candidate(tmp_path):
    polls = "\n".join(
        ",".join(c for i, c in enumerate(row.split(",")) if i != 15) for row in POLLS.splitlines()[:3]
    )
    assert told_nowhere(tmp_path, slate(without="OL"), polls_csv=polls + "\n") == []


def test_a_party_may_stand_on_the_list_alone_in_a_mixed_chamber(tmp_path):
    contest = CONTEST.replace('"plurality"', '"mixed_parallel"\nlist_seats = 4')
    assert told_nowhere(tmp_path, slate(without="UP"), contest_toml=contest) == []


def test_names_of_candidates_are_in_no_finding(tmp_path):
    """Findings may be published, names stay with the desk; also where the file's letters were guessed."""
    text = (
        LIST.replace("Ada Brae", "Ada Märe").replace("2031-04-02,ill", "02/13/2031,ill")
        + "N2,HU,Ada Märe,,,,\n"
    )
    found = findings(folder_with(tmp_path, text.encode("cp1252")))
    assert {p.rule.value for p in found} == {"R03", "R29", "R115"}
    assert not [p for p in found for name in ("Märe", "Sallow", "Orrin") if name in str(p)]
    assert str(next(p for p in found if p.rule.value == "R03")) == (
        "candidates.csv, row 2: found text that is not UTF-8; read as Windows-1252; expected UTF-8. "
        "Check that its letters with accents are right, and save the file as CSV UTF-8. [R03]"
    )


def test_everything_wrong_is_in_one_report(tmp_path):
    text = HEADER + (
        "N1,HU,,perhaps,,,\nN7,UP,,,,,\nM1,GF,,,,,\nN2,OL,,,gone,,\nM2,HU,,yes,,,\nM2,HU,,yes,,,\n"
        "M3,UP,,,withdrawn,,\nM3,HU,,,withdrawn,soon,\n"
    )
    assert rules(tmp_path, text) == [
        ("error", 2, "R31"), ("error", 3, "R108"), ("error", 4, "R109"), ("error", 5, "R31"),
        ("error", 5, "R109"), ("error", 7, "R110"), ("error", 7, "R111"), ("error", 8, "R112"),
        ("error", 9, "R27"), ("error", 9, "R113"),
    ]  # fmt: skip


def test_every_one_of_many_unknown_seats_is_named(tmp_path):
    found = findings(folder_with(tmp_path, LIST + "".join(f"N1{i},HU,,,,,\n" for i in range(40))))
    assert [(p.row, p.found) for p in found] == [(9 + i, f'"N1{i}"') for i in range(40)]
    assert found[0].remedy == 'Did you mean "N1"?'
    assert found[-1].remedy == "Write the label that it has there."


def test_codes_in_doubt_are_not_held_against_candidates(tmp_path):
    contest = CONTEST.replace('code = "OL"', 'code = "O L"').replace('"HU", "OL"', '"HU", "O L"')
    found = findings(folder_with(tmp_path, LIST, contest_toml=contest))
    assert {(p.file, p.rule.value) for p in found} == {("contest.toml", "R14")}


def test_a_rule_in_doubt_is_not_held_against_candidates(tmp_path):
    contest = CONTEST.replace('"plurality"', '"largest_remainder"\nlist_seats = 17')
    found = findings(folder_with(tmp_path, LIST + "N1,HU,Wim Sallow,yes,,,\n", contest_toml=contest))
    assert {(p.file, p.rule.value) for p in found} == {("contest.toml", "R98")}


def test_the_order_of_rows_never_matters(tmp_path):
    header, *rows = LIST.splitlines(keepends=True)
    tables = [
        read(folder_with(tmp_path, header + "".join(some))).candidates.sort_values(["seat", "code", "name"])
        for some in (rows, rows[::-1], rows[3:] + rows[:3])
    ]
    for table in tables[1:]:
        pd.testing.assert_frame_equal(table.reset_index(drop=True), tables[0].reset_index(drop=True))
