"""What a count of seats learns from elsewhere: an earlier result, and where voters go in a run-off."""

from __future__ import annotations

from itertools import permutations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from aggregator.inputs.sheet_table import SheetRow, SheetTable
from aggregator.inputs.vote_transfers import read_transfers
from tests.inputs.desk_folder import CONTEST, RESULT, as_rows, read, workbook, write_folder

TWO_ROUNDS = CONTEST.replace('"plurality"', '"two_round"')
RATES = "from,to,rate,sd,note\n,,20,10,\nOL,,40,9,\n,HU,30,8,\nOL,HU,70,5,said so\n"
CODES = ("HU", "UP", "OL", "OTH")


def test_the_earlier_result_has_the_form_of_the_last(tmp_path):
    inputs = read(write_folder(tmp_path / "c", result_before_last_csv=RESULT))
    assert list(inputs.before_last.columns) == list(inputs.last_result.columns)
    assert inputs.before_last["UP"].tolist() == inputs.last_result["UP"].tolist()
    assert inputs.warnings == ()


def test_a_party_that_was_not_there_yet_teaches_nothing(tmp_path):
    rows = [row.split(",") for row in RESULT.splitlines()]
    text = "\n".join(",".join(row[:5] + row[7:]) for row in rows)
    before = read(write_folder(tmp_path / "c", result_before_last_csv=text)).before_last
    assert before[["OL"]].isna().all(axis=None)
    assert before["UP"].tolist() == [6310, 4620, 6450, 5310, 8240]


def test_both_files_are_copied_and_hashed_with_the_others(tmp_path):
    folder = write_folder(
        tmp_path / "c", contest_toml=TWO_ROUNDS, result_before_last_csv=RESULT, transfers_csv=RATES
    )
    inputs = read(folder)
    assert [f.name for f in inputs.files][-2:] == ["result_before_last.csv", "transfers.csv"]
    assert [f.file for f in inputs.fingerprints] == [f.name for f in inputs.files]


def test_without_the_files_there_is_neither(tmp_path):
    inputs = read(write_folder(tmp_path / "c"))
    assert (inputs.before_last, inputs.transfers) == (None, None)


def test_workbooks_will_do(tmp_path):
    folder = write_folder(
        tmp_path / "c", contest_toml=TWO_ROUNDS,
        **{
            "result_before_last.xlsx": workbook(as_rows(RESULT), sheet="result"),
            "transfers.xlsx": workbook(as_rows(RATES), sheet="transfers"),
        },
    )  # fmt: skip
    inputs = read(folder)
    assert len(inputs.before_last) == 5
    assert len(inputs.transfers) == 12


def test_the_most_specific_row_holds(tmp_path):
    inputs = read(write_folder(tmp_path / "c", contest_toml=TWO_ROUNDS, transfers_csv=RATES))
    rate = inputs.transfers.set_index(["from", "to"])["rate"]
    assert list(inputs.transfers.columns) == ["from", "to", "rate", "sd"]
    assert sorted(rate.index) == sorted(permutations(CODES, 2))
    assert rate["OL", "HU"] == 70
    assert rate["OL", "UP"] == 40
    assert rate["UP", "HU"] == 30
    assert rate["UP", "OL"] == 20


def test_a_rate_may_be_certain(tmp_path):
    text = "from,to,rate,sd\n,,0,0\nOL,HU,100,0\n"
    inputs = read(write_folder(tmp_path / "c", contest_toml=TWO_ROUNDS, transfers_csv=text))
    assert inputs.transfers["sd"].eq(0).all()


def test_run_offs_in_one_region_need_transfers_too(tmp_path):
    where = '"plurality"\n[[counting.where]]\nregions = ["MERE"]\nrule = "two_round"\n'
    folder = write_folder(
        tmp_path / "c", contest_toml=CONTEST.replace('"plurality"', where), transfers_csv=RATES
    )
    assert len(read(folder).transfers) == 12


@pytest.fixture(scope="module")
def contest(tmp_path_factory):
    return read(write_folder(tmp_path_factory.mktemp("c") / "c")).contest


@given(
    pairs=st.lists(st.tuples(*[st.sampled_from(("", *CODES))] * 2), unique=True, max_size=12),
    order=st.randoms(use_true_random=False),
)
def test_the_order_of_rows_never_matters(pairs, order, contest):
    wanted = [("", ""), *(p for p in pairs if p[0] != p[1])]
    cells = [
        {c: v for c, v in zip(("from", "to"), pair, strict=True) if v}
        | {"rate": float(i), "sd": 1.0 * (i > 0)}
        for i, pair in enumerate(wanted)
    ]
    tables = []
    for shuffle in (False, True):
        if shuffle:
            order.shuffle(cells)
        rows = tuple(SheetRow(n, c) for n, c in enumerate(cells, start=2))
        table, problems = read_transfers(
            SheetTable("transfers.csv", ("from", "to", "rate", "sd"), rows), contest=contest
        )
        assert not problems
        tables.append(table)
    assert tables[0].equals(tables[1])
