"""How numbers are rounded, in tables and in words: one rule for the whole release.

Tables keep two decimals of a share; sentences and charts one. A chance is never printed as 0 or 100 %: a
finite number of draws cannot show either.
"""

from __future__ import annotations

import math
from datetime import date

import numpy as np
from numpy.typing import ArrayLike, NDArray

from aggregator.release.likelihood_words import likelihood_word

SHARE_DECIMALS_TABLE = 2
SHARE_DECIMALS_TEXT = 1
CHANCE_DECIMALS = 4
SMALLEST_CHANCE = 10.0**-CHANCE_DECIMALS


def round_chance(frequency: ArrayLike, *, samples: int) -> NDArray[np.float64]:
    """Probability to publish when an outcome occurred in a share of the draws.

    Half an occurrence and half a non-occurrence are added to the draws, (k + ½)/(S + 1), the posterior mean
    under Jeffreys' prior; so "never in 4,000 draws" is published as about 1 in 8,000, not as impossible.

    Parameters
    ----------
    frequency
        Share of the draws with the outcome, 0 to 1, any shape.
    samples
        Number of draws, S.

    Returns
    -------
    numpy.ndarray
        Probabilities with ``CHANCE_DECIMALS`` decimals, never 0 or 1.

    References
    ----------
    .. [1] Brown, L. D., Cai, T. T. and DasGupta, A. (2001). Interval estimation for a binomial proportion.
       Statistical Science 16(2), 101-133. https://doi.org/10.1214/ss/1009213286
    """
    estimate = (np.asarray(frequency, dtype=np.float64) * samples + 0.5) / (samples + 1.0)
    return np.clip(np.round(estimate, CHANCE_DECIMALS), SMALLEST_CHANCE, 1.0 - SMALLEST_CHANCE)


def chance_text(probability: float) -> str:
    """Write a chance in whole percent, ``<1 %`` and ``>99 %`` at the ends.

    Rounding never carries a chance into the band of another likelihood word: 0.896 is "likely" and reads
    89 %, not 90 %, which would be "very likely".
    """
    if probability < 0.01:
        return "<1 %"
    if probability > 0.99:
        return ">99 %"
    percent = round(100.0 * probability)
    if likelihood_word(percent / 100.0) != likelihood_word(probability):
        percent = math.floor(100.0 * probability) if percent > 100.0 * probability else percent + 1
    return f"{percent} %"


def share_text(percent: float, *, unit: bool = True) -> str:
    """Write a share given in percent, with one decimal."""
    return f"{percent:.{SHARE_DECIMALS_TEXT}f}" + (" %" if unit else "")


def share_interval_text(low: float, high: float) -> str:
    """Write an interval of shares given in percent, such as ``27.9 to 35.0 %``."""
    return f"{share_text(low, unit=False)} to {share_text(high)}"


def points_text(points: float) -> str:
    """Write a difference of shares in points, with its sign; a true minus sign, and no sign on zero."""
    rounded = round(points, SHARE_DECIMALS_TEXT)
    sign = "+" if rounded > 0 else "−" if rounded < 0 else ""
    return f"{sign}{abs(rounded):.{SHARE_DECIMALS_TEXT}f}"


def whole_text(number: float) -> str:
    """Write a count (seats, people) as a whole number with thousands commas."""
    return f"{round(number):,}"


def date_text(day: date) -> str:
    """Write a day as it is read aloud: ``18 May 2031``."""
    return f"{day.day} {day:%B %Y}"
