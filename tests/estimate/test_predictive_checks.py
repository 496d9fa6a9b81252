"""Published figures against what the model would have expected, on figures whose noise is known."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
from scipy.stats import betabinom, kstest

from aggregator.estimate.predictive_checks import (
    Expectation,
    figure_codes,
    leaves_band,
    rank_figures,
    tabulate_ranks,
)
from aggregator.inputs.contest import OTHERS, Alliance

SHARES = np.array([0.36, 0.27, 0.18, 0.12, 0.07])
PARTIES = ("FER", "LAN", "HED", "TID", OTHERS)
HOUSES = ("Plumb Line", "Saltbox Surveys", "Tally & Wick")
RESPONDENTS, DESIGN_EFFECT = 1000, 1.8


def answers(rng: np.random.Generator, count: int, *, design_effect: float) -> np.ndarray:
    """Rows whose variance is a design effect times that of simple random samples."""
    precision = (RESPONDENTS - design_effect) / (design_effect - 1)
    return np.stack(
        [rng.multinomial(RESPONDENTS, rng.dirichlet(precision * SHARES)) for _ in range(count)]
    ).astype(float)


def made_up_rows(rng: np.random.Generator, *, noise: dict[str, float], each: int = 25) -> SimpleNamespace:
    """Polls of three houses around known shares; ``noise`` multiplies the sd of a house's errors."""
    found = np.concatenate(
        [answers(rng, each, design_effect=DESIGN_EFFECT * noise.get(house, 1.0) ** 2) for house in HOUSES]
    )
    count = len(found)
    return SimpleNamespace(
        polls=tuple(f"P{number}" for number in range(count)),
        houses=HOUSES,
        poll_of_row=np.arange(count),
        house_of_row=np.repeat(np.arange(len(HOUSES)), each),
        respondents=np.full(count, float(RESPONDENTS)),
        answers=found,
        used=np.ones_like(found),
        small_row=np.array([], dtype=int),
        small_cell=np.array([], dtype=int),
        small_low=np.array([]),
        small_high=np.array([]),
    )


def sure_expectation(rows: SimpleNamespace, *, samples: int = 400) -> Expectation:
    """A model that knows shares and design effects, whatever the houses did."""
    count = len(rows.respondents)
    precision = (RESPONDENTS - DESIGN_EFFECT) / (DESIGN_EFFECT - 1)
    return Expectation(
        cells=np.broadcast_to(SHARES, (samples, count, len(SHARES))),
        precision=np.full((samples, count), precision),
        # Nothing was learned from the polls: leaving one out changes next to nothing.
        log_likelihood=1e-3 * np.random.default_rng(0).normal(size=(samples, count)),
    )


def checked(rows: SimpleNamespace, rng: np.random.Generator):
    ranks = rank_figures(rows, expectation=sure_expectation(rows), rng=rng)
    codes = [list(PARTIES)] * len(rows.respondents)
    return tabulate_ranks(ranks, rows=rows, codes=codes, rng=rng)


def house_rows(table, house: str):
    return table[(table["house"] == house) & (table["code"] == "")].iloc[0]


def test_house_three_times_as_noisy_as_its_design_effect_stands_out_and_honest_ones_do_not():
    rng = np.random.default_rng(1)
    table = checked(made_up_rows(rng, noise={"Saltbox Surveys": 3.0}), rng)
    loud = house_rows(table, "Saltbox Surveys")
    assert loud["stands_out"] == "yes"
    assert loud["spread_z"] == pytest.approx(3, rel=0.15)
    assert loud["inside_90"] < 60
    for honest in ("Plumb Line", "Tally & Wick"):
        assert house_rows(table, honest)["stands_out"] == "no"
        assert house_rows(table, honest)["spread_z"] == pytest.approx(1, rel=0.2)


def test_house_whose_figures_are_too_alike_stands_out():
    rng = np.random.default_rng(2)
    # The sd of a simple random sample is .75 of the expected one: half of that, and no sample is that good.
    rows = made_up_rows(rng, noise={})
    copied = rows.house_of_row == 2
    rows.answers[copied] = RESPONDENTS * SHARES + 0.4 * (rows.answers[copied] - RESPONDENTS * SHARES)
    table = checked(rows, rng)
    assert house_rows(table, "Tally & Wick")["stands_out"] == "yes"
    assert house_rows(table, "Tally & Wick")["spread_z"] < 0.6


def test_honest_registers_raise_few_false_alarms():
    rng = np.random.default_rng(3)
    alarms = sum(
        (checked(made_up_rows(rng, noise={}, each=8), rng)["stands_out"] == "yes").any() for _ in range(10)
    )
    assert alarms <= 1  # two in a hundred registers are expected


def test_honest_figures_lie_inside_central_intervals_as_often_as_they_should():
    rng = np.random.default_rng(4)
    overall = checked(made_up_rows(rng, noise={}, each=60), rng).iloc[0]
    assert (overall["house"], overall["code"], overall["figures"]) == ("", "", 900)
    assert overall["inside_50"] == pytest.approx(50, abs=6)
    assert overall["inside_90"] == pytest.approx(90, abs=4)
    assert overall["mean_z"] == pytest.approx(0, abs=0.1)


def test_rank_is_that_of_a_fit_without_the_poll():
    """Exact leave-one-out: a share with a flat prior, ten polls, beta-binomial without one of them."""
    rng = np.random.default_rng(5)
    size, polls, samples = 400, 10, 4000
    found = rng.binomial(size, 0.4, polls).astype(float)
    share = rng.beta(1 + found.sum(), 1 + (size - found).sum(), samples)
    rows = made_up_rows(rng, noise={})
    rows.__dict__.update(
        polls=tuple("abcdefghij"),
        poll_of_row=np.arange(polls),
        respondents=np.full(polls, float(size)),
        answers=np.stack([found, size - found], axis=1),
        used=np.ones((polls, 2)),
    )
    expectation = Expectation(
        cells=np.broadcast_to(np.stack([share, 1 - share], axis=1)[:, None], (samples, polls, 2)),
        precision=np.full((samples, polls), 1e9),
        log_likelihood=np.log(share)[:, None] * found + np.log1p(-share)[:, None] * (size - found),
    )
    ranks = rank_figures(rows, expectation=expectation, rng=rng)
    others = found.sum() - found
    exact = betabinom(size, 1 + others, 1 + (polls - 1) * size - others)
    middle = (exact.cdf(found) + exact.cdf(found - 1)) / 2
    np.testing.assert_allclose(ranks.low[:, 0], middle, atol=0.03)
    in_sample = betabinom(size, 1 + found.sum(), 1 + polls * size - found.sum())
    extreme = np.abs(middle - 0.5).argmax()
    # The fit that saw the poll finds it less surprising: the check would be too kind.
    assert abs(in_sample.cdf(found[extreme]) - 0.5) < abs(middle[extreme] - 0.5)


def test_figure_known_as_an_interval_is_inside_where_any_of_its_values_is():
    rng = np.random.default_rng(6)
    rows = made_up_rows(rng, noise={}, each=1)
    rows.small_row, rows.small_cell = np.array([0, 1]), np.array([4, 4])
    # About 70 answers are expected: one interval ends inside what is usual, the other far below it.
    rows.small_low, rows.small_high = np.array([0.0, 0.0]), np.array([60.0, 20.0])
    ranks = rank_figures(rows, expectation=sure_expectation(rows), rng=rng)
    assert ranks.low[0, 4] == 0
    assert ranks.high[0, 4] > 0.05
    assert ranks.high[1, 4] < 0.001
    table = tabulate_ranks(ranks, rows=rows, codes=[list(PARTIES)] * 3, rng=rng)
    small = table[table["code"] == OTHERS].set_index("house")
    assert small.loc["Plumb Line", "inside_90"] == 100
    assert small.loc["Saltbox Surveys", "inside_90"] == 0


def test_row_that_does_not_ask_for_a_party_has_no_figure_of_it():
    rng = np.random.default_rng(7)
    rows = made_up_rows(rng, noise={})
    rows.used[:, 3] = 0
    rows.answers[:, 3] = 0
    table = checked(rows, rng)
    assert "TID" not in set(table["code"])
    assert table.iloc[0]["figures"] == 4 * len(rows.respondents)


def test_figure_of_an_alliance_is_told_by_its_code_and_any_other_sum_is_others():
    partition = np.zeros((1, 3, 5))
    partition[0, 0, [1, 2]] = 1
    partition[0, 1, 0] = 1
    partition[0, 2, [3, 4]] = 1
    glow = Alliance(code="GLOW", name="Glow Pact", members=("LAN", "HED"))
    assert figure_codes(partition, parties=PARTIES, alliances=[glow]) == [["GLOW", "FER", OTHERS]]


def test_band_agrees_with_the_kolmogorov_smirnov_test_on_clear_cases():
    rng = np.random.default_rng(8)
    uniform, crowded = rng.uniform(size=80), rng.beta(3, 1, size=80)
    assert not leaves_band(uniform, chance=0.01, rng=rng)
    assert leaves_band(crowded, chance=0.01, rng=rng)
    assert kstest(uniform, "uniform").pvalue > 0.01 > kstest(crowded, "uniform").pvalue
