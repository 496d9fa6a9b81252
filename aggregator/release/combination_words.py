"""Combinations of parties in words."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from aggregator.seats.combinations import JOINED_BY

_NUMBERS = (
    "no",
    "one",
    "two",
    "three",
    "four",
    "five",
    "six",
    "seven",
    "eight",
    "nine",
    "ten",
    "eleven",
    "twelve",
)


def members_of(combination: str) -> tuple[str, ...]:
    """Codes of a combination."""
    return tuple(combination.split(JOINED_BY))


def combination_text(combination: str, names: Mapping[str, str]) -> str:
    """Name the parties of a combination: ``Harbour Union, Upland Party and Watershed``."""
    return listed([names[code] for code in members_of(combination)])


def listed(names: Sequence[str]) -> str:
    """Join names as a sentence does."""
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


def number_word(number: float) -> str:
    """Write a small whole number as a word."""
    return _NUMBERS[round(number)] if round(number) < len(_NUMBERS) else f"{round(number)}"
