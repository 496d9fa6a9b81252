"""Fits of past dates against the result: what users of the scores rely on."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from aggregator.errors import InputError
from aggregator.replays.methods import Method
from aggregator.replays.score_replay import ReplayScores, score_replay
from tests.replays.made_up_replay import MadeUpReplay, made_up_replay


@pytest.fixture(scope="module")
def replay(tmp_path_factory: pytest.TempPathFactory) -> MadeUpReplay:
    return made_up_replay(tmp_path_factory.mktemp("contest"))


@pytest.fixture(scope="module")
def scores(replay: MadeUpReplay) -> ReplayScores:
    return score_replay(replay.records, inputs=replay.inputs, outcome=replay.outcome)


def country(scores: ReplayScores, **wanted: str) -> pd.DataFrame:
    rows = scores.scores[scores.scores["region"] == ""]
    for column, value in wanted.items():
        rows = rows[rows[column] == value]
    return rows


def test_shares_of_truth_sum_to_a_hundred_and_seats_to_the_chamber(scores):
    for quantity, total in (("support", 100.0), ("seats", 24.0)):
        rows = country(scores, method="fieldfold", quantity=quantity)
        sums = rows[rows["level"] != "alliance"].groupby("as_of")["truth"].sum()
        assert sums.to_numpy() == pytest.approx(total)


def test_every_method_gives_shares_that_sum_to_a_hundred_and_seats_that_fill_the_chamber(scores):
    rows = country(scores)
    rows = rows[rows["level"] != "alliance"]
    sums = rows.groupby(["quantity", "method", "as_of"])["estimate"].sum()
    assert sums.loc["support"].to_numpy() == pytest.approx(100.0)
    assert sums.loc["seats"].to_numpy() == pytest.approx(24.0)
    assert set(rows["method"]) == set(Method)


def test_an_alliance_is_the_sum_of_its_members(scores):
    rows = country(scores, quantity="support", method="decaying_mean").pivot(index="as_of", columns="code")
    for column in ("estimate", "truth"):
        table = rows[column]
        assert table["GLOW"].to_numpy() == pytest.approx((table["LAN"] + table["HED"]).to_numpy())


def test_the_order_of_records_polls_and_seats_changes_nothing(replay, scores):
    shuffled = replace(replay.inputs, polls=replay.inputs.polls.sample(frac=1, random_state=2))
    outcome = replay.outcome.sample(frac=1, random_state=3)
    again = score_replay(replay.records[::-1], inputs=shuffled, outcome=outcome)
    for name in ("scores", "seat_scores", "reliability", "summary", "comparisons", "staleness", "places"):
        pd.testing.assert_frame_equal(
            getattr(again, name), getattr(scores, name), check_exact=False, rtol=1e-9
        )


def test_the_same_seed_gives_the_same_places_of_seats_and_another_seed_others(replay):
    first, again, other = (
        score_replay(replay.records[:1], inputs=replay.inputs, outcome=replay.outcome, seed=seed).scores
        for seed in (4, 4, 5)
    )
    pd.testing.assert_series_equal(again["pit"], first["pit"])
    seats = first["quantity"] == "seats"
    assert not np.allclose(other.loc[seats, "pit"], first.loc[seats, "pit"], equal_nan=True)


def test_a_party_is_not_scored_where_it_does_not_stand(scores):
    rows = scores.scores[(scores.scores["region"] == "SKERRY") & (scores.scores["code"] == "HED")]
    assert rows.empty


def test_a_correction_of_later_is_not_seen_by_rivals_that_are_given_the_register_of_the_day(replay):
    day = pd.Timestamp(replay.records[-1].facts["as_of"])
    first_print = replay.inputs.polls[replay.inputs.polls["published"] <= day].copy()
    first_print.loc[first_print["published"].idxmax(), "FER"] = 90.0
    given = score_replay(
        replay.records, inputs=replay.inputs, outcome=replay.outcome, polls_as_of={day.date(): first_print}
    )
    latest = country(given, method="latest_poll", quantity="support", code="FER")
    assert latest.set_index("as_of")["estimate"].loc[day] > 50
    assert (latest.set_index("as_of")["estimate"].drop(day) < 50).all()


def test_a_tie_in_the_outcome_is_refused_with_the_seat_named(replay):
    outcome = replay.outcome.copy()
    outcome.loc[0, ["FER", "LAN"]] = 9_999.0
    with pytest.raises(InputError, match="the same votes for FER and LAN in seat SK01"):
        score_replay(replay.records, inputs=replay.inputs, outcome=outcome)


def test_a_result_by_region_scores_support_and_no_seats(replay):
    by_region = replay.outcome.groupby("region", as_index=False)[
        list(replay.inputs.contest.party_codes)
    ].sum()
    by_region = by_region.assign(seat="", name="")
    found = score_replay(replay.records, inputs=replay.inputs, outcome=by_region)
    assert set(found.scores["quantity"]) == {"support"}
    assert found.seat_scores.empty and found.reliability.empty


def test_chances_that_came_true_for_sure_score_nothing_and_the_opposite_scores_two(replay):
    won = replay.outcome.set_index("seat")[list(replay.inputs.contest.party_codes)]
    sure = won.eq(won.max(axis=1), axis=0).astype(float)
    right, wrong = replay.records[0], replay.records[1]
    right = replace(right, data=right.data.assign(seat_chance=(("seat", "party"), sure.to_numpy())))
    beside = np.roll(sure.to_numpy(), 1, axis=1)
    wrong = replace(wrong, data=wrong.data.assign(seat_chance=(("seat", "party"), beside)))
    table = score_replay([right, wrong], inputs=replay.inputs, outcome=replay.outcome).seat_scores
    own = table[table["method"] == "fieldfold"]
    assert own["brier"].tolist() == pytest.approx([0.0, 2.0])
    assert own["leaders_wrong"].tolist() == pytest.approx([0.0, 24.0])
    assert np.isfinite(own["log_score"]).all()


def test_no_records_is_an_error(replay):
    with pytest.raises(ValueError, match="at least one fit"):
        score_replay([], inputs=replay.inputs, outcome=replay.outcome)


@pytest.fixture(scope="module")
def many(tmp_path_factory: pytest.TempPathFactory) -> dict[float, pd.DataFrame]:
    """Scores of 6 made-up contests, one date each, with honest draws and with draws three times too sure."""
    folder = tmp_path_factory.mktemp("many")
    return {
        too_sure: pd.concat([_one(folder, seed, too_sure) for seed in range(6)]) for too_sure in (1.0, 3.0)
    }


def _one(folder: Path, seed: int, too_sure: float) -> pd.DataFrame:
    one = made_up_replay(folder, seed=seed + 100, dates=1, too_sure=too_sure)
    # Rivals are not looked at here: two polls and no last result keep them short.
    inputs = replace(one.inputs, polls=one.inputs.polls.head(2), last_result=None)
    table = score_replay(one.records, inputs=inputs, outcome=one.outcome).scores
    return table[(table["method"] == "fieldfold") & (table["region"] == "") & (table["level"] != "alliance")]


def test_intervals_of_honest_draws_hold_as_often_as_they_say_and_others_show(many):
    support = {key: rows[rows["quantity"] == "support"] for key, rows in many.items()}
    assert support[1.0]["inside_90"].mean() > 0.75
    assert 0.25 < support[1.0]["inside_50"].mean() < 0.75
    assert support[3.0]["inside_90"].mean() < 0.65


def test_honest_draws_have_the_better_proper_scores(many):
    for score in ("crps", "log_score"):
        honest, sure = (many[key].loc[many[key]["quantity"] == "support", score].mean() for key in (1.0, 3.0))
        assert honest < sure
