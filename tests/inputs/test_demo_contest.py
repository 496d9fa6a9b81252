"""The demo contest, whole: it is read as it stands, and the order of its rows does not matter."""

from __future__ import annotations

import random
from datetime import date
from pathlib import Path

import pandas as pd
import pytest

from aggregator.inputs.contest_folder import read_contest_folder

DEMO = Path(__file__).parents[2] / "data_demo" / "lake_provinces"
TODAY = date(2035, 1, 1)


def shuffled(folder: Path, *, seed: int) -> Path:
    folder.mkdir()
    order = random.Random(seed)
    (folder / "contest.toml").write_bytes((DEMO / "contest.toml").read_bytes())
    for name in ("polls.csv", "result_last.csv", "result_counted.csv", "past_errors.csv"):
        header, *rows = (DEMO / name).read_text(encoding="utf-8").splitlines()
        order.shuffle(rows)
        (folder / name).write_text("\n".join([header, *rows]) + "\n", encoding="utf-8")
    return folder


def in_order(frame: pd.DataFrame, *, by: list[str]) -> pd.DataFrame:
    kept = frame.drop(columns="row", errors="ignore")
    return kept.sort_values(by).reset_index(drop=True)


@pytest.mark.parametrize("as_of", [None, date(2025, 12, 1)])
def test_the_order_of_rows_never_matters(as_of, tmp_path):
    plain = read_contest_folder(DEMO, as_of=as_of, today=TODAY)
    other = read_contest_folder(shuffled(tmp_path / "c", seed=3), as_of=as_of, today=TODAY)
    assert (other.run_date, other.contest) == (plain.run_date, plain.contest)
    for table, by in (("polls", ["poll", "regions"]), ("unused_polls", ["poll", "regions", "question"])):
        pd.testing.assert_frame_equal(
            in_order(getattr(other, table), by=by), in_order(getattr(plain, table), by=by)
        )
    pd.testing.assert_frame_equal(
        in_order(other.last_result, by=["seat"]), in_order(plain.last_result, by=["seat"])
    )


def test_every_row_is_used_or_listed_with_its_reason():
    inputs = read_contest_folder(DEMO, today=TODAY)
    rows = len((DEMO / "polls.csv").read_text(encoding="utf-8").splitlines()) - 1
    assert len(inputs.polls) + len(inputs.unused_polls) == rows
    assert inputs.unused_polls["why_not"].str.len().min() > 0


def test_shares_and_remainder_sum_to_100_in_every_row():
    inputs = read_contest_folder(DEMO, today=TODAY)
    total = inputs.polls[[*inputs.contest.column_codes, "remainder"]].sum(axis=1)
    assert total.between(100 - 1e-9, 100 + 1e-9).all()
