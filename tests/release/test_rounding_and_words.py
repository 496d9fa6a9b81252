"""Numbers and words: one rule, and the published scale."""

from datetime import date

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from aggregator.release.likelihood_words import LIKELIHOOD_SCALE, likelihood_word
from aggregator.release.rounding import (
    chance_text,
    date_text,
    points_text,
    round_chance,
    share_interval_text,
    whole_text,
)

# Source: Mastrandrea et al. 2010, IPCC AR5 guidance note, table 1 (nested bands, both ends included).
PUBLISHED_SCALE = {
    "virtually certain": (0.99, 1.0),
    "very likely": (0.90, 1.0),
    "likely": (0.66, 1.0),
    "about as likely as not": (0.33, 0.66),
    "unlikely": (0.0, 0.33),
    "very unlikely": (0.0, 0.10),
    "exceptionally unlikely": (0.0, 0.01),
}


def test_the_scale_is_the_published_one_and_has_no_other_words():
    assert {band.word: (band.low, band.high) for band in LIKELIHOOD_SCALE} == PUBLISHED_SCALE


@pytest.mark.parametrize(
    ("probability", "word"),
    [
        (1.0, "virtually certain"),
        (0.99, "virtually certain"),
        (0.9899, "very likely"),
        (0.90, "very likely"),
        (0.8999, "likely"),
        (0.6601, "likely"),
        (0.66, "about as likely as not"),  # the narrower of the two bands that hold 0.66
        (0.50, "about as likely as not"),
        (0.33, "about as likely as not"),
        (0.3299, "unlikely"),
        (0.1001, "unlikely"),
        (0.10, "very unlikely"),
        (0.0101, "very unlikely"),
        (0.01, "exceptionally unlikely"),
        (0.0, "exceptionally unlikely"),
    ],
)
def test_a_chance_at_a_band_edge_takes_the_narrowest_band_that_holds(probability, word):
    assert likelihood_word(probability) == word


@given(st.floats(0, 1))
def test_no_narrower_band_than_the_one_used_holds_the_chance(probability):
    low, high = PUBLISHED_SCALE[likelihood_word(probability)]
    assert low <= probability <= high
    for other_low, other_high in PUBLISHED_SCALE.values():
        if other_low <= probability <= other_high:
            assert high - low <= other_high - other_low + 1e-12


@pytest.mark.parametrize("wrong", [-0.01, 1.01, float("nan")])
def test_what_is_no_probability_is_refused(wrong):
    with pytest.raises(ValueError, match="probability"):
        likelihood_word(wrong)


@given(st.floats(0, 1))
def test_a_printed_chance_is_never_0_or_100_percent_and_never_in_another_band(probability):
    text = chance_text(probability)
    assert text not in {"0 %", "100 %"}
    if text.startswith("<"):
        assert probability < 0.01
    elif text.startswith(">"):
        assert probability > 0.99
    else:
        printed = int(text.removesuffix(" %")) / 100
        assert abs(printed - probability) <= 0.01 + 1e-12
        assert likelihood_word(printed) == likelihood_word(probability)


@pytest.mark.parametrize(
    ("probability", "text"),
    [
        (0.0, "<1 %"),
        (0.0099, "<1 %"),
        (0.012, "2 %"),
        (0.5, "50 %"),
        (0.896, "89 %"),
        (0.6604, "67 %"),
        (1.0, ">99 %"),
    ],
)
def test_chances_read_as_expected(probability, text):
    assert chance_text(probability) == text


def test_a_chance_no_draw_showed_is_published_as_small_not_as_zero():
    chances = round_chance(np.array([0.0, 0.5, 1.0]), samples=4_000)
    assert chances.tolist() == [0.0001, 0.5, 0.9999]


@given(st.floats(0, 1), st.integers(10, 100_000))
def test_published_chances_keep_away_from_0_and_1_and_near_the_frequency(frequency, samples):
    chance = float(round_chance(frequency, samples=samples))
    assert 0 < chance < 1
    assert abs(chance - frequency) <= 0.5 / samples + 1e-4


def test_numbers_read_as_expected():
    assert share_interval_text(27.94, 35.0) == "27.9 to 35.0 %"
    assert [points_text(x) for x in (1.25, -0.04, -1.3)] == ["+1.2", "0.0", "−1.3"]
    assert whole_text(12345.6) == "12,346"
    assert date_text(date(2031, 5, 8)) == "8 May 2031"
