"""Many contests together, and their final errors as the next contest's record."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import pandas as pd
import pytest

from aggregator.errors import UsageError
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.new_contest import new_contest
from aggregator.replays.past_errors_file import past_errors, write_past_errors
from aggregator.replays.pooling import pool_replays
from aggregator.replays.score_replay import ReplayScores, score_replay
from tests.replays.made_up_replay import made_up_replay


@pytest.fixture(scope="module")
def replays(tmp_path_factory: pytest.TempPathFactory) -> list[ReplayScores]:
    folder = tmp_path_factory.mktemp("contests")
    made = [made_up_replay(folder, seed=seed, dates=3, title=f"Isles {seed}") for seed in (1, 2, 3)]
    return [score_replay(one.records, inputs=one.inputs, outcome=one.outcome) for one in made]


def test_the_order_of_contests_changes_nothing(replays):
    one, other = pool_replays(replays), pool_replays(replays[::-1])
    for name in ("by_size", "summary", "comparisons", "reliability", "places", "staleness"):
        pd.testing.assert_frame_equal(getattr(one, name), getattr(other, name))


def test_one_contest_pooled_is_itself(replays):
    alone = pool_replays(replays[:1])
    for name in ("summary", "comparisons", "reliability", "places", "staleness"):
        pd.testing.assert_frame_equal(getattr(alone, name), getattr(replays[0], name))


def test_errors_by_size_average_contests_and_give_their_standard_error(replays):
    table = pool_replays(replays).by_size
    row = table[
        (table["method"] == "latest_poll") & (table["size_from"] == 30) & (table["lead"] == "all")
    ].iloc[0]
    means = []
    for replay in replays:
        rows = replay.scores[(replay.scores["region"] == "") & (replay.scores["quantity"] == "support")]
        own = rows[rows["method"] == "fieldfold"].set_index(["as_of", "code"])["estimate"]
        polls = rows[(rows["method"] == "latest_poll") & (rows["level"] != "alliance")]
        large = polls[[own[key] >= 30 for key in zip(polls["as_of"], polls["code"], strict=True)]]
        means.append(large["error"].abs().mean())
    assert row["mean_absolute_error"] == pytest.approx(sum(means) / 3)
    assert row["contests"] == 3 and row["standard_error"] > 0


def test_two_contests_of_one_title_are_refused(replays):
    with pytest.raises(UsageError, match="two contests are called 'Isles 1'"):
        pool_replays([replays[0], replays[0]])


def test_the_record_holds_the_polling_average_of_the_last_date_and_the_result(replays):
    table = past_errors(replays[:1])
    rows = replays[0].scores
    last = rows[(rows["as_of"] == rows["as_of"].max()) & (rows["method"] == "mean_30_days")]
    last = last[(last["region"] == "") & (last["level"] != "alliance")]
    assert table["polled"].tolist() == last["estimate"].tolist()
    assert table["result"].sum() == pytest.approx(100)
    assert set(table["election"]) == {pd.Timestamp("2033-05-15")}


def test_a_contest_reads_the_record_that_was_written(replays, tmp_path: Path):
    new_contest(tmp_path / "next", today=date(2033, 6, 1))
    write_past_errors(replays[:1], path=tmp_path / "next" / "past_errors.csv")
    record = read_contest_folder(tmp_path / "next", today=date(2033, 6, 1)).past_errors
    assert record is not None
    expected = past_errors(replays[:1])
    assert record["code"].tolist() == expected["code"].tolist()
    assert record["polled"].tolist() == pytest.approx(expected["polled"].tolist(), abs=0.005)


def test_a_record_that_is_there_is_never_overwritten(replays, tmp_path: Path):
    path = tmp_path / "past_errors.csv"
    path.write_text("mine", encoding="utf-8")
    with pytest.raises(UsageError, match="exists already"):
        write_past_errors(replays, path=path)
    assert path.read_text(encoding="utf-8") == "mine"
    assert [p.name for p in tmp_path.iterdir()] == ["past_errors.csv"]
