"""The closed lists of words that tables of a release use."""

from __future__ import annotations

from enum import StrEnum


class Level(StrEnum):
    """What a code stands for, so that no sum counts anyone twice."""

    PARTY = "party"
    ALLIANCE = "alliance"
    OTHERS = "others"


class Kind(StrEnum):
    """Which of two statements a row makes: they are never confused."""

    ON_DATE = "on_date"
    ON_POLLING_DAY = "on_polling_day"


class LeanKind(StrEnum):
    """What may make a poll lean beside its house."""

    MODE = "mode"
    POPULATION = "population"
    ASKED_TOGETHER = "asked_together"


class SeatsVotes(StrEnum):
    """What is read off how seats follow votes."""

    CURVE = "curve"
    RESPONSIVENESS = "responsiveness"
    LEAD_AT_EQUAL_VOTES = "lead_at_equal_votes"
