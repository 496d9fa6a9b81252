"""What a screen leaves: a question to ask, the polls it is about, what was found and what is usual."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import astuple, dataclass, fields
from enum import StrEnum

import pandas as pd

JOINER = "; "
"""Between the identifiers of a question's polls."""

# One screen of an honest register asks a needless question in at most one of twenty runs.
LEVEL = 0.05


class Screen(StrEnum):
    """The screens, by what they look at."""

    SPREAD = "spread"
    REPEATED_FIGURES = "repeated_figures"
    POOLED_SAMPLE = "pooled_sample"
    SAMPLE_SIZE = "sample_size"
    TIMING = "timing"


@dataclass(frozen=True)
class Question:
    """One question for a house, or for the desk itself; never a finding of fault.

    Attributes
    ----------
    screen
        The screen that asks.
    house
        The house asked; blank where it is about all houses, several joined by "; ".
    code
        The code it is about; blank where it is about all codes or none.
    polls
        Identifiers of the polls it is about, joined by "; ".
    found, usual
        What was found, and what would have been usual.
    question
        The question, with the innocent explanations.
    """

    screen: Screen
    house: str
    code: str
    polls: str
    found: str
    usual: str
    question: str


COLUMNS = tuple(field.name for field in fields(Question))


def questions_table(questions: Iterable[Question]) -> pd.DataFrame:
    """Put questions into a table, one row each, in the order of the screens."""
    order = list(Screen)
    ordered = sorted(questions, key=lambda q: order.index(q.screen))
    return pd.DataFrame([astuple(q) for q in ordered], columns=list(COLUMNS), dtype=object)


def joined_polls(polls: Iterable[object]) -> str:
    """Join identifiers, each once, in the order given."""
    return JOINER.join(dict.fromkeys(str(poll) for poll in polls))


def screens_by_poll(screens: pd.DataFrame) -> dict[str, str]:
    """Name the screens each poll appears in, joined by "; ", by the poll's identifier."""
    found: dict[str, list[str]] = {}
    for screen, polls in zip(screens["screen"], screens["polls"], strict=True):
        for poll in polls.split(JOINER):
            found.setdefault(poll, []).append(str(screen))
    return {poll: JOINER.join(dict.fromkeys(names)) for poll, names in found.items()}
