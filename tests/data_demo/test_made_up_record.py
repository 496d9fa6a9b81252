"""Errors that all polls of a made-up election share: the record of the past, the undecided, and turnout."""

from dataclasses import replace
from datetime import date
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from data_demo.made_up_contest_text import contest_text
from data_demo.made_up_country import LEAN_SCALE, draw_country
from data_demo.made_up_election import SMALL_ELECTION, UNTIDY_ELECTION, simulate_election
from data_demo.made_up_folder import write_contest_folder
from data_demo.made_up_record import draw_past_errors
from data_demo.made_up_result import draw_polling_day
from data_demo.made_up_size import draw_scenery

RECORD_SIZE = replace(SMALL_ELECTION, weeks=10, polled_weeks=8, past_elections=5, dissolved_party=True)


def test_past_errors_follow_the_law_of_the_shared_lean() -> None:
    scenery = draw_scenery(RECORD_SIZE, rng=np.random.default_rng(0))
    scaled = []
    for seed in range(80):
        country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(seed))
        record = draw_past_errors(country, shared_lean=True, rng=np.random.default_rng([1, seed]))
        assert record["election"].nunique() == 5
        np.testing.assert_allclose(record.groupby("election")[["polled", "result"]].sum(), 100, atol=0.31)
        result = record["result"].to_numpy() / 100
        error = (record["polled"] - record["result"]).to_numpy() / 100
        scaled.append(error / np.sqrt(result * (1 - result)))
    # The softmax bends large errors a little.
    assert np.sqrt(np.mean(np.square(scaled))) == pytest.approx(LEAN_SCALE, rel=0.06)


def test_the_record_of_the_last_election_is_the_lean_its_polls_had() -> None:
    scenery = draw_scenery(replace(RECORD_SIZE, undecided_stray=True), rng=np.random.default_rng(0))
    country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(3))
    record = draw_past_errors(country, shared_lean=True, rng=np.random.default_rng(4))
    last = record[record["election"] == str(scenery.last_election)].set_index("code")
    votes = country.last_votes[["P1", "P2"]].sum() / country.last_votes.iloc[:, 3:].to_numpy().sum()
    np.testing.assert_allclose(last.loc[["P1", "P2"], "result"], 100 * votes, atol=0.051)
    lean = country.weights @ (country.lean[0] - country.undecided_lean[0])
    moved = np.log(last.loc[["P1", "P2"], "polled"] / last.loc[["P1", "P2"], "result"])
    assert moved["P1"] - moved["P2"] == pytest.approx(lean[0] - lean[1], abs=0.006)


def test_without_a_shared_lean_the_record_has_no_errors() -> None:
    election = simulate_election(2, size=RECORD_SIZE, shared_lean=False)
    assert (election.past_errors["polled"] == election.past_errors["result"]).all()


def test_the_undecided_add_their_part_to_the_shared_lean() -> None:
    """Fifteen points at 40 % for a group of the size of the undecided, the same on every day."""
    size = replace(SMALL_ELECTION, weeks=10, polled_weeks=8, undecided_stray=True)
    scenery = draw_scenery(size, rng=np.random.default_rng(0))
    assert scenery.undecided == pytest.approx(0.1)
    scaled = []
    for seed in range(250):
        country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(seed))
        national = np.einsum("r,trp->tp", country.weights, country.undecided_lean[[0, -1]])
        law = 0.1 * 0.15 / np.sqrt(0.24) / np.sqrt(country.last_shares)
        scaled.append(national / law)
    assert np.std(scaled) == pytest.approx(1, abs=0.06)
    plain = draw_country(
        replace(scenery, undecided_stray=False), shared_lean=True, rng=np.random.default_rng(249)
    )
    np.testing.assert_allclose(country.lean - country.undecided_lean, plain.lean, atol=1e-12)
    np.testing.assert_array_equal(country.log_support, plain.log_support)


def test_the_parts_of_the_shared_lean_sum_to_it() -> None:
    lean = simulate_election(3, size=replace(UNTIDY_ELECTION, polls=60, seats=40)).truth.lean
    parts = lean[["record_log_points", "undecided_log_points", "houses_log_points"]]
    np.testing.assert_allclose(parts.sum(axis=1), lean["log_points"], atol=1e-12)
    assert (parts.abs().groupby(lean["code"]).max() > 0).all(axis=None)


def test_turnout_goes_with_support_where_it_is_asked_to() -> None:
    size = replace(SMALL_ELECTION, seats=3, turnout_tilt=True)
    scenery = draw_scenery(size, rng=np.random.default_rng(0))
    country = draw_country(scenery, shared_lean=True, rng=np.random.default_rng(1))
    above = np.exp(country.log_support[-1]) - country.weights @ np.exp(country.log_support[-1])
    tilts = []
    for seed in range(100):
        tilted = draw_polling_day(country, rng=np.random.default_rng(seed))
        plain = replace(country, scenery=replace(scenery, turnout_tilt=False))
        level = draw_polling_day(plain, rng=np.random.default_rng(seed))
        moved = np.log(tilted.turnout_weights / level.turnout_weights)
        expected = above @ tilted.turnout_tilt
        np.testing.assert_allclose(moved - moved.mean(), expected - expected.mean(), atol=1e-12)
        assert (level.turnout_tilt == 0).all()
        tilts.append(tilted.turnout_tilt)
    assert np.std(tilts) == pytest.approx(0.2, rel=0.1)


def test_a_folder_holds_counts_and_record_only_where_the_election_has_them(tmp_path: Path) -> None:
    untidy = simulate_election(1, size=replace(UNTIDY_ELECTION, polls=60, seats=40))
    write_contest_folder(untidy, tmp_path / "untidy")
    counted = pd.read_csv(tmp_path / "untidy" / "result_counted.csv")
    assert set(counted["region"]) == {untidy.scenery.regions[-1].code}
    last = pd.read_csv(tmp_path / "untidy" / "result_last.csv")
    assert set(counted["seat"]) <= set(last["seat"])
    record = pd.read_csv(tmp_path / "untidy" / "past_errors.csv")
    assert list(record) == ["election", "code", "polled", "result"]
    assert record["election"].nunique() == 5
    write_contest_folder(simulate_election(1, size=SMALL_ELECTION), tmp_path / "small")
    assert not {"result_counted.csv", "past_errors.csv"} & {p.name for p in (tmp_path / "small").iterdir()}


def test_the_contest_text_tells_jolts_and_phases() -> None:
    scenery = draw_scenery(UNTIDY_ELECTION, rng=np.random.default_rng(0))
    text = contest_text(scenery)
    assert text.count("[[jolt]]") == 1
    assert f"polling_day = {scenery.regions[-1].polling_day}" in text
    assert f"counted = {scenery.regions[-1].counted}" in text
    assert "[[jolt]]" not in contest_text(draw_scenery(SMALL_ELECTION, rng=np.random.default_rng(0)))
    assert isinstance(scenery.regions[-1].counted, date)
