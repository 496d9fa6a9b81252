"""Any file a spreadsheet program may write gives the same table, or says why it cannot."""

from __future__ import annotations

import csv
import io
import zipfile
from datetime import date

import openpyxl
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.inputs.desk_folder import (
    CONTEST,
    POLLS,
    RESULT,
    as_rows,
    findings,
    read,
    workbook,
    write_folder,
)

NUMBER_COLUMNS = ("sample", "effective", "HU", "UP", "OL", "LAKE", "OTH", "undecided")
DATE_COLUMNS = ("start", "end", "published", "status_date")


def written(text: str, *, separator: str = ",", decimal: str = ".", line_end: str = "\n") -> str:
    """A CSV text written another way."""
    stream = io.StringIO()
    writer = csv.writer(stream, delimiter=separator, lineterminator=line_end)
    header, *rows = csv.reader(io.StringIO(text))
    writer.writerow(header)
    for row in rows:
        writer.writerow(
            [c.replace(".", decimal) if h in NUMBER_COLUMNS else c for h, c in zip(header, row, strict=True)]
        )
    return stream.getvalue()


def true_cells(text: str) -> list[list[object]]:
    """A CSV text as a workbook's true numbers and dates."""
    header, *rows = as_rows(text)
    cells: list[list[object]] = [header]
    for row in rows:
        true: list[object] = []
        for name, cell in zip(header, row, strict=True):
            if cell is None:
                true.append(None)
            elif name in DATE_COLUMNS:
                true.append(date.fromisoformat(str(cell)))
            else:
                true.append(float(str(cell)) if name in NUMBER_COLUMNS else cell)
        cells.append(true)
    return cells


SAME_TABLE: dict[str, dict[str, str | bytes | None]] = {
    "semicolons and decimal commas": {"polls.csv": written(POLLS, separator=";", decimal=",")},
    "tabs": {"polls.csv": written(POLLS, separator="\t")},
    "commas inside quotation marks": {"polls.csv": written(POLLS, decimal=",")},
    "a byte order mark": {"polls.csv": POLLS.encode("utf-8-sig")},
    "UTF-16 with its mark": {"polls.csv": POLLS.encode("utf-16")},
    "Windows line ends": {"polls.csv": written(POLLS, line_end="\r\n")},
    "old line ends": {"polls.csv": written(POLLS, line_end="\r")},
    "mixed line ends": {"polls.csv": POLLS.replace("\n", "\r\n", 2)},
    "trailing separators everywhere": {"polls.csv": POLLS.replace("\n", ",,\n")},
    "a declared separator": {"polls.csv": "sep=;\n" + written(POLLS, separator=";")},
    "thousands marks": {"polls.csv": POLLS.replace(",1540,1210,", ',"1,540",1\u202f210,')},
    "thousands points": {
        "polls.csv": written(POLLS, separator=";", decimal=",").replace(";1540;", ";1.540;")
    },
    "percent signs": {"polls.csv": POLLS.replace("39.6,,55.5", "39.6%,,55.5 %")},
    "blanks around cells": {"polls.csv": POLLS.replace(",Kestrel Poll,", ", Kestrel Poll\u00a0,")},
    "dates with points": {"polls.csv": POLLS.replace("2031-04-23", "2031.04.23")},
    "midnight": {"polls.csv": POLLS.replace("2031-04-23", "2031-04-23 00:00:00")},
    "a workbook of text": {"polls.csv": None, "polls.xlsx": workbook(as_rows(POLLS))},
    "a workbook of numbers and dates": {"polls.csv": None, "polls.xlsx": workbook(true_cells(POLLS))},
    "a workbook with a sheet called polls": {
        "polls.csv": None,
        "polls.xlsx": workbook(true_cells(POLLS), others=("remarks", "old")),
    },
}


@pytest.mark.parametrize("files", SAME_TABLE.values(), ids=SAME_TABLE.keys())
def test_however_a_register_is_written_the_table_is_the_same(files, tmp_path):
    plain = read(write_folder(tmp_path / "plain"))
    other = read(write_folder(tmp_path / "other", **files))
    renumbered = other.polls.assign(row=plain.polls["row"])
    pd.testing.assert_frame_equal(renumbered, plain.polls)
    assert other.warnings == ()


def test_day_first_dates_are_the_same_days_and_a_warning_says_so(tmp_path):
    header, *rows = csv.reader(io.StringIO(POLLS))
    turned = [
        ["/".join(reversed(c.split("-"))) if h in DATE_COLUMNS else c for h, c in zip(header, r, strict=True)]
        for r in rows
    ]
    text = "\n".join(",".join(r) for r in [header, *turned])
    plain = read(write_folder(tmp_path / "plain"))
    other = read(write_folder(tmp_path / "other", polls_csv=text))
    pd.testing.assert_frame_equal(other.polls, plain.polls)
    assert [p.rule.value for p in other.warnings] == ["R29"]


def test_rows_are_counted_as_a_spreadsheet_counts_them(tmp_path):
    lines = POLLS.splitlines()
    lines.insert(2, "")
    lines[1] = lines[1].replace("Lake Courier", '"Lake\nCourier"')
    lines[5] = lines[5].replace(",1090,", ",none,")
    folder = write_folder(tmp_path / "contest", polls_csv="\n".join(lines))
    assert [(p.row, p.column) for p in findings(folder)] == [(6, "sample")]


def test_a_last_result_may_be_a_workbook(tmp_path):
    plain = read(write_folder(tmp_path / "plain"))
    cells = [[int(c) if str(c).isdigit() else c for c in row] for row in as_rows(RESULT)]
    other = write_folder(
        tmp_path / "other",
        contest_toml=CONTEST.replace('"result_last.csv"', '"votes.xlsx"'),
        result_last_csv=None,
        **{"votes.xlsx": workbook(cells, sheet="whatever")},
    )
    pd.testing.assert_frame_equal(read(other).last_result, plain.last_result)


UNREADABLE: dict[str, tuple[dict[str, str | bytes | None], str]] = {
    "a second register": (
        {"polls.xlsx": workbook(as_rows(POLLS))},
        "error: polls.xlsx: found a second register beside polls.csv; expected one register. "
        "Move one of the two out of the folder. [R01]",
    ),
    "a contest not in UTF-8": (
        {"contest.toml": CONTEST.replace("Shore", "Shör").encode("cp1252")},
        "error: contest.toml: found bytes that are not UTF-8; expected text in UTF-8. "
        "Save the file again as UTF-8. [R02]",
    ),
    "a workbook under a text file's name": (
        {"polls.csv": workbook(as_rows(POLLS))},
        "error: polls.csv: found a workbook under a text file's name; expected text. "
        "Name it .xlsx, or save it as CSV. [R02]",
    ),
    "bytes that are no text": (
        {"result_last.csv": RESULT.encode("utf-16-le")},
        "error: result_last.csv: found bytes that are not text; expected a text file in UTF-8. "
        "Save the file again as CSV UTF-8. [R02]",
    ),
    "Windows-1252": (
        {"polls.csv": POLLS.replace("Lake Courier", "Kurier Süd").encode("cp1252")},
        'warning: polls.csv, row 2: found text that is not UTF-8; read as Windows-1252 ("Süd"); '
        "expected UTF-8. Check that the word is right, and save the file as CSV UTF-8. [R03]",
    ),
    "two sheets": (
        {"polls.csv": None, "polls.xlsx": workbook(as_rows(POLLS), sheet="register", others=("old",))},
        "error: polls.xlsx: found 2 sheets (register, old); expected one sheet, or one called "
        '"polls". Name the sheet to read "polls". [R05]',
    ),
    "a formula that was never computed": (
        {
            "polls.csv": None,
            "polls.xlsx": workbook([[c if c != "1012" else "=1000+12" for c in r] for r in as_rows(POLLS)]),
        },
        "error: polls.xlsx, row 2: found a formula without a computed value in cell I2; expected a value. "
        "Type the value, or open and save the workbook in a spreadsheet program. [R05]",
    ),
    "dates half true, half text": (
        {
            "polls.csv": None,
            "polls.xlsx": workbook(
                [
                    [{"2031-04-20": date(2031, 4, 2), "2031-04-23": "23/04/2031"}.get(str(c), c) for c in r]
                    for r in as_rows(POLLS)
                ]
            ),
        },
        'error: polls.xlsx, row 6, column end: found "23/04/2031" as text, while row 6, column start holds a '
        "true date; expected true dates in all cells, or text in all. A spreadsheet program may have swapped "
        "day and month in the true ones: check them, and write all as 2031-04-23. [R30]",
    ),
    "a tick instead of a word": (
        {
            "polls.csv": None,
            "polls.xlsx": workbook(
                [
                    [True if (i, j) == (1, 22) else c for j, c in enumerate(r)]
                    for i, r in enumerate(as_rows(POLLS))
                ]
            ),
        },
        "error: polls.xlsx, row 2, column use: found TRUE; expected one of yes, no, or blank. "
        "Write yes or no. [R31]",
    ),
}


@pytest.mark.parametrize(("files", "report"), UNREADABLE.values(), ids=UNREADABLE.keys())
def test_what_a_file_cannot_say_is_reported(files, report, tmp_path):
    found = findings(write_folder(tmp_path / "contest", **files))
    assert [f"{p.severity.value}: {p}" for p in found] == [report]


def test_an_archive_that_is_no_workbook_is_reported(tmp_path):
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("content.xml", "<office/>")
    folder = write_folder(tmp_path / "c", polls_csv=None, **{"polls.xlsx": stream.getvalue()})
    assert [p.rule.value for p in findings(folder)] == ["R02"]


def test_an_error_value_is_not_a_blank_cell(tmp_path):
    book = openpyxl.load_workbook(io.BytesIO(workbook(as_rows(POLLS))))
    cell = book.active["R6"]
    cell.value, cell.data_type = "#REF!", "e"
    stream = io.BytesIO()
    book.save(stream)
    folder = write_folder(tmp_path / "c", polls_csv=None, **{"polls.xlsx": stream.getvalue()})
    assert [(p.row, p.found) for p in findings(folder)] == [(6, "the error #REF! in cell R6")]


def test_merged_cells_are_reported(tmp_path):
    book = openpyxl.load_workbook(io.BytesIO(workbook(as_rows(POLLS))))
    book.active.merge_cells("B4:B5")
    stream = io.BytesIO()
    book.save(stream)
    folder = write_folder(tmp_path / "contest", polls_csv=None, **{"polls.xlsx": stream.getvalue()})
    assert [(p.row, p.rule.value) for p in findings(folder)] == [(4, "R05"), (5, "R24")]


@settings(max_examples=20, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(order=st.permutations(range(1, 6)))
def test_the_order_of_rows_never_matters(order, tmp_path):
    header, *rows = POLLS.splitlines()
    shuffled = "\n".join([header, *(rows[i - 1] for i in order)])
    plain = read(write_folder(tmp_path / "plain"))
    other = read(write_folder(tmp_path / "other", polls_csv=shuffled))

    def sorted_rows(frame: pd.DataFrame) -> pd.DataFrame:
        return frame.drop(columns="row").sort_values(["poll", "regions"]).reset_index(drop=True)

    pd.testing.assert_frame_equal(sorted_rows(other.polls), sorted_rows(plain.polls))
    assert (other.run_date, other.unpublished) == (plain.run_date, plain.unpublished)


@settings(max_examples=12, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(seed=st.randoms(use_true_random=False))
def test_the_order_of_columns_never_matters(seed, tmp_path):
    frame = pd.read_csv(io.StringIO(POLLS), dtype=str, keep_default_na=False)
    columns = list(frame.columns)
    seed.shuffle(columns)
    plain = read(write_folder(tmp_path / "plain"))
    other = read(write_folder(tmp_path / "other", polls_csv=frame[columns].to_csv(index=False)))
    pd.testing.assert_frame_equal(other.polls, plain.polls)
