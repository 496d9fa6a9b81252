"""The same figures twice: the chance of it, and when it is asked about."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from aggregator.screens.repeated_figures import ask_about_repeated_figures, repetition_chance
from tests.screens.made_up_registers import CODES, tidy_register


@pytest.mark.parametrize(
    ("shares", "steps"),
    [
        ((0.5, 0.3, 0.2), (0.01, 0.01)),
        ((0.45, 0.3, 0.15, 0.1), (0.01, 0.01)),
        ((0.55, 0.4, 0.05), (0.005, 0.005)),
        ((0.6, 0.4), (0.001, 0.01)),
        ((0.6, 0.36, 0.04), (0.02, 0.02)),
    ],
)
def test_the_chance_of_a_repetition_is_the_one_simulated(shares, steps):
    rng = np.random.default_rng(11)
    sizes, runs = (800, 1300), 400_000
    printed = [
        np.round(rng.multinomial(n, shares, size=runs)[:, :-1] / n / g).astype(int) * round(g * 1000)
        for n, g in zip(sizes, steps, strict=True)
    ]
    simulated = (printed[0] == printed[1]).all(axis=1).mean()
    found = repetition_chance(
        np.array([shares[:-1]]), respondents=np.array([sizes], dtype=float), step=np.array([steps])
    )[0]
    assert found == pytest.approx(simulated, rel=0.1, abs=5e-5)


def repeated(polls: pd.DataFrame, *, first: int, second: int) -> pd.DataFrame:
    copied = polls.copy()
    copied.loc[second, list(CODES)] = copied.loc[first, list(CODES)].to_numpy()
    copied.loc[second, "rounding_step"] = copied.loc[first, "rounding_step"]
    return copied


def test_the_same_decimals_in_two_polls_of_a_house_are_asked_about_months_apart():
    polls = repeated(tidy_register(1, steps=(0.1,)), first=8, second=168)
    (question,) = ask_about_repeated_figures(polls, codes=CODES)
    assert question.house == "House 0"
    assert question.polls == "P008; P168"
    assert "entered twice" in question.question


def test_the_same_decimals_of_two_houses_name_both():
    polls = repeated(tidy_register(1, steps=(0.1,)), first=8, second=12)
    (question,) = ask_about_repeated_figures(polls, codes=CODES)
    assert question.house == "House 0; House 4"


def test_three_polls_with_one_set_of_figures_are_one_question():
    polls = repeated(repeated(tidy_register(1, steps=(0.1,)), first=8, second=168), first=8, second=88)
    (question,) = ask_about_repeated_figures(polls, codes=CODES)
    assert question.polls == "P008; P088; P168"


def test_few_parties_in_whole_points_repeat_by_chance_and_nobody_is_asked():
    rng = np.random.default_rng(2)
    polls = tidy_register(2, steps=(1.0,))
    first = np.round(100 * rng.binomial(1000, 0.55, len(polls)) / 1000)
    two = polls.assign(AA=first, BB=100 - first, respondents=1000.0)
    two[["CC", "DD", "EE", "OTH"]] = np.nan
    assert two.duplicated(["AA", "house"]).any()
    assert ask_about_repeated_figures(two, codes=CODES) == []


def test_overlapping_windows_of_a_tracking_poll_may_repeat():
    polls = repeated(tidy_register(1, steps=(0.1,)), first=8, second=168)
    polls.loc[168, ["start", "end"]] = polls.loc[8, ["start", "end"]].to_numpy()
    assert ask_about_repeated_figures(polls, codes=CODES) == []


def test_polls_that_offered_other_parties_are_not_compared():
    polls = repeated(tidy_register(1, steps=(0.1,)), first=8, second=168)
    polls.loc[168, "EE"] = np.nan
    polls.loc[168, "remainder"] = polls.loc[8, "EE"] + polls.loc[8, "OTH"]
    assert ask_about_repeated_figures(polls, codes=CODES) == []
