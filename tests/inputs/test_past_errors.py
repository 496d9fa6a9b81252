"""The desk's record of earlier elections, by which the error that all houses share gets its size."""

from __future__ import annotations

from datetime import date

import pytest

from tests.inputs.desk_folder import as_rows, findings, read, workbook, write_folder

RECORD = """\
election,code,polled,result,source
2027-05-16,HU,38,41.5,State Gazette
2027-05-16,UP,36.5,34,State Gazette
2023-05-21,HU,40,37.1,
2023-05-21,UP,33,36,
"""


def folder_with(tmp_path, text: str, **files: str | bytes | None):
    return write_folder(tmp_path / "c", **{"past_errors.csv": text}, **files)


def rules(tmp_path, text: str) -> list[tuple[str, int | None, str]]:
    return [(p.severity.value, p.row, p.rule.value) for p in findings(folder_with(tmp_path, text))]


def test_columns_and_units_are_as_promised(tmp_path):
    inputs = read(folder_with(tmp_path, RECORD))
    record = inputs.past_errors
    assert list(record.columns) == ["election", "code", "polled", "result"]
    assert record["election"].dtype == "datetime64[ns]"
    assert list(record["polled"]) == [38, 36.5, 40, 33]
    assert inputs.warnings == ()


def test_the_file_is_copied_and_hashed_with_the_others(tmp_path):
    inputs = read(folder_with(tmp_path, RECORD))
    assert [f.name for f in inputs.files][-1] == "past_errors.csv"
    assert [f.file for f in inputs.fingerprints] == [f.name for f in inputs.files]


def test_without_a_record_there_is_none(tmp_path):
    assert read(write_folder(tmp_path / "c")).past_errors is None


def test_a_workbook_will_do(tmp_path):
    book = workbook(as_rows(RECORD), sheet="past_errors")
    record = read(write_folder(tmp_path / "c", **{"past_errors.xlsx": book})).past_errors
    assert list(record["result"]) == [41.5, 34, 37.1, 36]


def test_decimal_commas_are_read_as_in_every_table(tmp_path):
    text = RECORD.replace(",", ";").replace(".", ",")
    assert list(read(folder_with(tmp_path, text)).past_errors["result"]) == [41.5, 34, 37.1, 36]


def test_a_party_that_is_no_more_still_teaches(tmp_path):
    inputs = read(folder_with(tmp_path, RECORD + "2023-05-21,RF,12,13,\n"))
    assert list(inputs.past_errors["code"]) == ["HU", "UP", "HU", "UP", "RF"]
    assert [p.rule.value for p in inputs.warnings] == ["R88"]


def test_a_code_is_only_taken_for_a_slip_where_the_right_one_is_missing(tmp_path):
    slip = [p.remedy for p in findings(folder_with(tmp_path, RECORD.replace("23-05-21,UP", "23-05-21,UPP")))]
    other = [p.remedy for p in findings(folder_with(tmp_path, RECORD + "2023-05-21,UPP,2,1,\n"))]
    assert slip[0].startswith('If "UP" is meant')
    assert other[0].startswith("The rows teach")


def test_an_election_held_after_the_day_of_the_run_is_not_seen(tmp_path):
    text = RECORD + "2031-04-06,HU,39,40,\n2031-04-06,UP,37,36,\n"
    folder = folder_with(tmp_path, text)
    assert len(read(folder, as_of=date(2031, 4, 5)).past_errors) == 4
    assert len(read(folder, as_of=date(2031, 4, 6)).past_errors) == 6


@pytest.mark.parametrize("order", [[0, 1, 2, 3], [3, 1, 0, 2]])
def test_the_order_of_rows_never_matters(order, tmp_path):
    header, *rows = RECORD.splitlines(keepends=True)
    record = read(folder_with(tmp_path, header + "".join(rows[i] for i in order))).past_errors
    found = record.sort_values(["election", "code"])["result"]
    assert list(found) == [37.1, 36, 41.5, 34]


def test_everything_wrong_is_in_one_report(tmp_path):
    text = RECORD.replace("38,41.5", "138,41.5").replace("36.5,34", ",34")
    text = text.replace("2023-05-21,HU", "2033-05-21,HU") + "2023-05-21,UP,33,36,\n"
    assert rules(tmp_path, text) == [
        ("error", 2, "R35"), ("error", 3, "R24"), ("error", 4, "R86"), ("error", 6, "R87"),
    ]  # fmt: skip


def test_small_parties_alone_are_not_taken_for_fractions(tmp_path):
    text = "election,code,polled,result\n2027-05-16,HU,0.9,1.1\n2027-05-16,UP,0.4,0.3\n"
    assert rules(tmp_path, text) == []
