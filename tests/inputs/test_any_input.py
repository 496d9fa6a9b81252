"""Whatever stands in a cell or behind a key, the desk gets a report, never an internal error."""

from __future__ import annotations

import csv
import io

import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from tests.inputs.desk_folder import CONTEST, POLLS, RESULT, as_rows, findings, workbook, write_folder

ODD_CELLS = st.one_of(
    st.text(max_size=12).filter(lambda t: "\x00" not in t),
    st.sampled_from(
        ["0", "-1", "1e9", "nan", "inf", "1,024", "1.024", "34,5", "34.5%", "<1", "99999999999999999999", "٣",
         "2031-02-29", "0000-00-00", "31/12/9999", "04/05/2031", "23/04/2031", "+", "NORTH+", "OTH", "ALL",
         "K-1", "M-1", "yes", "no", "withdrawn", "vote", "exit", "seats_only", "TRUE", '"', "\ufeff", "  "]
    ),
)  # fmt: skip

ODD_VALUES = st.sampled_from(
    ["0", "-1", "1e400", "nan", "true", '""', '"x"', '"HU"', "[]", '["HU"]', '[["HU"]]', "{}", "{ HU = 1 }",
     "2031-05-18", "2031-05-18T10:00:00", "0001-01-01", "9999-12-31", '"2031-05-18"', "10:00:00", "[{}]"]
)  # fmt: skip

# The sound contest with one region voting, and counted, before the other, and every kind of table in it.
PHASES = CONTEST.replace(
    'name = "Northern Shore"', 'name = "Northern Shore"\npolling_day = 2031-04-25\ncounted = 2031-04-27'
) + (
    '\n[[jolt]]\ndate = 2031-03-01\nweeks = 2\nname = "The chancellor resigned"\n'
    '\n[model]\nramp = true\ntarget_population = "voters"\nshared_lean_points = 2\n'
)
COUNT = """\
seat,name,region,HU,UP,OL,OTH
N1,Northgate,NORTH,9300,7200,,990
N2,Pier Head,NORTH,10900,5300,,870
"""
RECORD = """\
election,code,polled,result,source,note
2027-05-16,HU,38,41.5,State Gazette,
2027-05-16,UP,36.5,34,,
2023-05-21,HU,40,37.1,,
"""

CANDIDATES = """\
seat,code,name,holder,status,status_date,source,note
N1,HU,Ada Brae,yes,,,,
N1,UP,Tam Orrin,,withdrawn,2031-04-02,,
N1,OTH,,,,,,
M1,OL,,,,2031-03-02,,
M1,HU,,no,standing,,,
"""

SLOW_SETUP = [HealthCheck.function_scoped_fixture]


def with_cells(text: str, changes: list[tuple[int, int, str]]) -> str:
    rows = list(csv.reader(io.StringIO(text)))
    for row, column, cell in changes:
        rows[row % len(rows)][column % len(rows[0])] = cell
    stream = io.StringIO()
    csv.writer(stream).writerows(rows)
    return stream.getvalue()


CHANGES = st.lists(st.tuples(st.integers(0, 50), st.integers(0, 50), ODD_CELLS), min_size=1, max_size=3)


@settings(max_examples=60, deadline=None, suppress_health_check=SLOW_SETUP)
@given(changes=CHANGES)
def test_any_cells_in_the_register(changes, tmp_path):
    findings(write_folder(tmp_path / "c", polls_csv=with_cells(POLLS, changes).encode("utf-8", "replace")))


@settings(max_examples=40, deadline=None, suppress_health_check=SLOW_SETUP)
@given(changes=CHANGES)
def test_any_cells_in_the_last_result(changes, tmp_path):
    text = with_cells(RESULT, changes).encode("utf-8", "replace")
    findings(write_folder(tmp_path / "c", result_last_csv=text))


@settings(max_examples=40, deadline=None, suppress_health_check=SLOW_SETUP)
@given(changes=CHANGES)
def test_any_cells_in_a_count(changes, tmp_path):
    text = with_cells(COUNT, changes).encode("utf-8", "replace")
    findings(write_folder(tmp_path / "c", contest_toml=PHASES, **{"result_counted.csv": text}))


@settings(max_examples=40, deadline=None, suppress_health_check=SLOW_SETUP)
@given(changes=CHANGES)
def test_any_cells_in_the_record(changes, tmp_path):
    text = with_cells(RECORD, changes).encode("utf-8", "replace")
    findings(write_folder(tmp_path / "c", **{"past_errors.csv": text}))


@settings(max_examples=40, deadline=None, suppress_health_check=SLOW_SETUP)
@given(changes=CHANGES)
def test_any_cells_among_candidates(changes, tmp_path):
    text = with_cells(CANDIDATES, changes).encode("utf-8", "replace")
    findings(write_folder(tmp_path / "c", **{"candidates.csv": text}))


@settings(max_examples=80, deadline=None, suppress_health_check=SLOW_SETUP)
@given(line=st.integers(0, 60), value=ODD_VALUES)
def test_any_value_in_the_contest(line, value, tmp_path):
    lines = PHASES.splitlines()
    keyed = [i for i, text in enumerate(lines) if "=" in text]
    place = keyed[line % len(keyed)]
    lines[place] = f"{lines[place].split('=')[0]}= {value}"
    findings(write_folder(tmp_path / "c", contest_toml="\n".join(lines), **{"result_counted.csv": COUNT}))


@settings(max_examples=30, deadline=None, suppress_health_check=SLOW_SETUP)
@given(start=st.integers(0, 600), length=st.integers(1, 300))
def test_any_torn_file(start, length, tmp_path):
    findings(
        write_folder(
            tmp_path / "c",
            contest_toml=CONTEST[:start] + CONTEST[start + length :],
            polls_csv=POLLS[:start] + POLLS[start + length :],
            result_last_csv=RESULT[:start] + RESULT[start + length :],
        )
    )


@pytest.mark.parametrize(
    "name",
    [
        "contest.toml", "polls.csv", "polls.xlsx", "result_last.csv", "result_counted.csv", "past_errors.csv",
        "candidates.csv",
    ],
)  # fmt: skip
@settings(max_examples=15, deadline=None, suppress_health_check=SLOW_SETUP)
@given(data=st.binary(max_size=200))
@example(data=b"\xa0")
def test_any_bytes_at_all(name, data, tmp_path):
    files: dict[str, str | bytes | None] = {"polls.csv": None} if name == "polls.xlsx" else {}
    assert findings(write_folder(tmp_path / "c", **(files | {name: data})))


@settings(max_examples=40, deadline=None, suppress_health_check=SLOW_SETUP)
@given(places=st.lists(st.tuples(st.floats(0, 0.999), st.integers(0, 255)), min_size=1, max_size=20))
def test_any_damage_to_a_workbook(places, tmp_path):
    data = bytearray(workbook(as_rows(POLLS)))
    for place, byte in places:
        data[int(place * len(data))] = byte
    findings(write_folder(tmp_path / "c", **{"polls.csv": None, "polls.xlsx": bytes(data)}))
