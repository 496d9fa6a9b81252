"""The table of questions: what it holds, and how it words them."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from pathlib import Path

import numpy as np
import pytest

from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.screens.questions import COLUMNS, Screen, screens_by_poll
from aggregator.screens.screen_polls import screen_polls

DEMO = Path(__file__).parents[2] / "data_demo" / "lake_provinces"
WORDS_OF_BLAME = (
    "fraud",
    "fake",
    "manipul",
    "suspic",
    "cheat",
    "herding",
    "invented",
    "fabricat",
    "wrongdoing",
)


def screened(inputs):
    return screen_polls(inputs, rng=np.random.default_rng(1))


@pytest.fixture(scope="module")
def inputs():
    return read_contest_folder(DEMO, today=date.today())


@pytest.fixture(scope="module")
def spoilt(inputs):
    """The demo with one poll copied under another house, one sample tenfold, and one house smoothed."""
    polls, codes = inputs.polls.copy(), list(inputs.contest.column_codes)
    house = polls["house"].value_counts().index[0]
    mine = polls.index[polls["house"] == house]
    national = [i for i in mine if len(polls.loc[i, "regions"]) == len(inputs.contest.region_codes)]
    polls.loc[national, codes] = polls.loc[national, codes].rolling(9, min_periods=1, center=True).mean()
    other = polls.index[polls["house"] != house][0]
    polls.loc[other, "sample"] *= 10
    return replace(inputs, polls=polls), house, str(polls.loc[other, "poll"])


def test_every_question_asks_and_blames_nobody(spoilt):
    table = screened(spoilt[0])
    assert tuple(table.columns) == COLUMNS
    assert len(table)
    assert table["question"].str.contains(r"\?").all()
    for text in table[["found", "usual", "question"]].to_numpy().ravel():
        assert not [word for word in WORDS_OF_BLAME if word in text.lower()]


def test_the_screens_find_what_was_put_in(spoilt):
    inputs, house, tenfold = spoilt
    table = screened(inputs)
    assert house in set(table.loc[table["screen"] == Screen.SPREAD, "house"])
    assert tenfold in set(table.loc[table["screen"] == Screen.SAMPLE_SIZE, "polls"])
    assert "sample_size" in screens_by_poll(table)[tenfold].split("; ")


def test_the_honest_demo_raises_no_question(inputs):
    assert screened(inputs).empty


def test_order_of_rows_changes_no_question(spoilt):
    inputs = spoilt[0]
    turned = replace(inputs, polls=inputs.polls.iloc[::-1].reset_index(drop=True))
    asked = [
        set(zip(t["screen"], t["house"], t["code"], strict=True)) for t in map(screened, (inputs, turned))
    ]
    assert asked[0] == asked[1]


def test_a_register_of_three_polls_can_be_screened(inputs):
    assert screened(replace(inputs, polls=inputs.polls.head(3))).empty
    assert screened(replace(inputs, polls=inputs.polls.head(1))).empty
