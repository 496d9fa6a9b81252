"""Figures too alike: the statistic against published values, honest registers, and herds."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from scipy.stats import chi2, kstest
from statsmodels.stats.multitest import multipletests

from aggregator.screens.questions import LEVEL
from aggregator.screens.repeated_figures import ask_about_repeated_figures
from aggregator.screens.spread import ExpectedFigures, ask_about_spread, spread_looks
from aggregator.screens.spread_statistic import window_spread
from tests.screens.made_up_registers import (
    CODES,
    REGIONS,
    SHARES,
    pulled_together,
    simulated_inputs,
    tidy_register,
)

# A screen of a tidy register may ask a needless question in 5 % of runs: of 24 runs five or more in one of
# 170 series.
RUNS, MOST_NEEDLESS = 24, 4


def rng_of_looks() -> np.random.Generator:
    return np.random.default_rng(1)


def asked(polls: pd.DataFrame) -> list:
    return ask_about_spread(polls, codes=CODES, regions=REGIONS, rng=rng_of_looks())


@pytest.mark.parametrize(("degrees", "lower"), [(9, 3.325), (19, 10.117), (29, 17.708)])
def test_the_smallest_twentieth_of_spreads_is_where_the_tables_of_chi_square_put_it(degrees, lower):
    """Lower 5 % points: common tables of the chi-square distribution."""
    assert chi2.ppf(0.05, degrees) == pytest.approx(lower, abs=6e-4)
    rng = np.random.default_rng(degrees)
    respondents = rng.integers(600, 1800, degrees + 1).astype(float)
    spreads = [
        window_spread(
            rng.binomial(respondents.astype(int), 0.4)[:, None] / respondents[:, None],
            respondents=respondents,
            step=np.full(degrees + 1, 0.0),
        )
        for _ in range(3000)
    ]
    assert {free for _, free in spreads} == {degrees}
    below = np.mean([x < lower for x, _ in spreads])
    assert below == pytest.approx(0.05, abs=4 * np.sqrt(0.05 * 0.95 / 3000))


def test_one_code_of_equal_samples_gives_the_textbook_sum():
    share, n = np.array([0.31, 0.33, 0.30, 0.34]), 1000.0
    mean = share.mean()
    by_hand = ((share - mean) ** 2 / (mean * (1 - mean) / n)).sum()
    found, free = window_spread(share[:, None], respondents=np.full(4, n), step=np.zeros(4))
    assert (found, free) == (pytest.approx(by_hand), 3)


@pytest.mark.parametrize("step", [0.0, 0.001, 0.005, 0.01])
def test_rounding_makes_honest_figures_neither_too_alike_nor_too_far_apart(step):
    rng = np.random.default_rng(5)
    shares, n = np.array([0.4, 0.25, 0.15, 0.2]), np.full(8, 1000.0)
    chances = []
    for _ in range(1500):
        found = rng.multinomial(1000, shares, size=8)[:, :3] / 1000
        printed = np.round(found / step) * step if step else found
        x2, free = window_spread(printed, respondents=n, step=np.full(8, step))
        chances.append(chi2.cdf(x2, free))
    assert kstest(chances, "uniform").pvalue > 0.001


def test_figures_that_rounding_would_make_alike_are_not_looked_at():
    """A party of 3 % in whole points is printed as 3 by every honest large sample."""
    rng = np.random.default_rng(1)
    polls = tidy_register(1, steps=(1.0,)).assign(respondents=4000.0)
    few = np.round(rng.normal(3, 0.27, len(polls)))
    looks = spread_looks(polls.assign(EE=few), codes=CODES, regions=REGIONS, rng=rng_of_looks())
    assert "EE" not in {look.code for look in looks}
    assert {look.code for look in looks} >= {"", "AA"}


def test_the_tidiest_honest_register_rarely_raises_a_question():
    """Simple random samples of opinion that stands still: nothing honest is more alike."""
    registers = [tidy_register(seed) for seed in range(RUNS)]
    assert sum(bool(asked(polls)) for polls in registers) <= MOST_NEEDLESS
    repeated = [ask_about_repeated_figures(polls, codes=CODES) for polls in registers]
    assert sum(map(bool, repeated)) <= MOST_NEEDLESS


def test_a_house_pulled_halfway_to_the_field_is_asked_when_its_samples_are_simple():
    house = "House 3"
    found = [
        {q.house for q in asked(pulled_together(tidy_register(seed), houses={house}, codes=CODES))}
        for seed in range(5)
    ]
    assert all(house in houses for houses in found)


def test_a_field_that_follows_itself_is_asked_as_a_field():
    polls = tidy_register(2)
    questions = asked(pulled_together(polls, houses=set(polls["house"]), codes=CODES))
    field = [q for q in questions if not q.house and not q.code]
    assert len(field) == 1
    assert field[0].question.endswith(".") and "?" in field[0].question
    assert "past votes" in field[0].question


def test_movement_and_leans_never_make_figures_look_too_alike():
    polls = tidy_register(4)
    day = (polls["end"] - polls["end"].min()).dt.days
    moving = polls.assign(AA=polls["AA"] + day / 100, BB=polls["BB"] - day / 100)
    for moved, still in zip(
        spread_looks(moving, codes=("AA", "BB"), regions=REGIONS, rng=rng_of_looks()),
        spread_looks(polls, codes=("AA", "BB"), regions=REGIONS, rng=rng_of_looks()),
        strict=True,
    ):
        assert moved.statistic > 0.8 * still.statistic
    leaning = polls.assign(AA=polls["AA"] + polls["house"].str[-1].astype(int))
    field = {
        (x.house, x.code): x.ratio
        for x in spread_looks(leaning, codes=("AA",), regions=REGIONS, rng=rng_of_looks())
    }
    assert field["", "AA"] > 2
    assert field["House 1", "AA"] < 2


def test_a_tracking_polls_overlapping_windows_are_not_compared_with_each_other():
    polls = tidy_register(3)
    tracker = polls[polls["house"] == "House 0"].sort_values("end").reset_index(drop=True)
    tracker["end"] = tracker["start"].iloc[0] + pd.to_timedelta(np.arange(len(tracker)), unit="D")
    tracker["start"] = tracker["end"] - pd.Timedelta(days=6)
    # Every day the same figures but for one day's interviews.
    tracker[list(CODES)] = tracker[list(CODES)].iloc[0].to_numpy()
    (look,) = [
        x
        for x in spread_looks(tracker, codes=("AA",), regions=REGIONS, rng=rng_of_looks())
        if x.house and x.code == "AA"
    ] or [None]
    assert look is None or len(look.polls) <= len(tracker) // 7 + 1


def test_order_of_rows_and_of_codes_changes_no_question():
    polls = pulled_together(tidy_register(6), houses={"House 1"}, codes=CODES)
    turned = ask_about_spread(polls.iloc[::-1], codes=CODES[::-1], regions=REGIONS, rng=rng_of_looks())
    assert {(q.house, q.code) for q in asked(polls)} == {(q.house, q.code) for q in turned}


def test_looks_are_adjusted_as_a_general_library_adjusts_them():
    polls = pulled_together(tidy_register(7), houses={"House 1", "House 2"}, codes=CODES)
    looks = spread_looks(polls, codes=CODES, regions=REGIONS, rng=rng_of_looks())
    for family in ([x for x in looks if not x.code], [x for x in looks if x.code]):
        rejected = multipletests([x.chance for x in family], alpha=LEVEL / 2, method="fdr_bh")[0]
        kept = {(x.house, x.code) for x, yes in zip(family, rejected, strict=True) if yes}
        whole = not family[0].code
        assert kept == {(q.house, q.code) for q in asked(polls) if (not q.code) == whole}


def expected_of_a_fit(polls: pd.DataFrame, *, seed: int) -> ExpectedFigures:
    """Draws around the truth, as uncertain as a fit of many polls would leave them."""
    rng = np.random.default_rng(seed)
    truth = np.array(list(SHARES.values()))
    share = truth * np.exp(rng.normal(0, 0.01, (100, 1, len(truth))))
    share = np.repeat(share / share.sum(axis=-1, keepdims=True), len(polls), axis=1)
    coords = {"row": polls["row"].to_numpy(), "code": list(CODES)}
    return ExpectedFigures(
        share=xr.DataArray(share, dims=("sample", "row", "code"), coords=coords),
        design_effect=xr.DataArray(
            np.ones((100, len(polls))), dims=("sample", "row"), coords={"row": coords["row"]}
        ),
    )


def test_against_a_fit_every_poll_counts_whatever_the_time_between_polls():
    polls = tidy_register(8, polls=64, days=1600)
    herded = pulled_together(polls, houses={"House 5"}, codes=CODES, pull=1.0)
    known = expected_of_a_fit(polls, seed=1)
    looks = {
        (x.house, x.code): x
        for x in spread_looks(polls, codes=CODES, regions=REGIONS, expected=known, rng=rng_of_looks())
    }
    assert len(looks["House 5", ""].polls) == 8
    assert looks["House 5", ""].degrees > 30
    assert looks["House 5", ""].ratio == pytest.approx(1, abs=0.6)
    smooth = herded.copy()
    mine = smooth["house"] == "House 5"
    smooth.loc[mine, list(CODES)] = 100 * np.array(list(SHARES.values()))
    asked_of = ask_about_spread(smooth, codes=CODES, regions=REGIONS, expected=known, rng=rng_of_looks())
    assert "House 5" in {q.house for q in asked_of}


def test_against_a_fit_the_tidiest_honest_register_rarely_raises_a_question():
    needless = 0
    for seed in range(20):
        polls = tidy_register(seed, polls=64, days=1600)
        known = expected_of_a_fit(polls, seed=seed)
        needless += bool(
            ask_about_spread(polls, codes=CODES, regions=REGIONS, expected=known, rng=rng_of_looks())
        )
    assert needless <= 4  # more than four of twenty: once in 400 series at one in twenty


def test_an_honest_election_raises_no_question_about_its_spread():
    inputs = simulated_inputs(3)
    codes = [c for c in inputs.contest.column_codes if inputs.polls[c].notna().any()]
    assert (
        ask_about_spread(inputs.polls, codes=codes, regions=inputs.contest.region_codes, rng=rng_of_looks())
        == []
    )
