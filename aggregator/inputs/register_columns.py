"""The columns of the desk's tables and the words their cells may hold."""

from __future__ import annotations

from enum import StrEnum


class Question(StrEnum):
    """What the respondents were asked; only ``vote`` enters the fit."""

    VOTE = "vote"
    HYPOTHETICAL = "hypothetical"
    HEAD_TO_HEAD = "head_to_head"
    EXIT = "exit"
    RECALL = "recall"
    SEATS_ONLY = "seats_only"


class Status(StrEnum):
    """How final a row of the register is."""

    FINAL = "final"
    PROVISIONAL = "provisional"
    WITHDRAWN = "withdrawn"


class Use(StrEnum):
    """The desk's own decision on a row."""

    YES = "yes"
    NO = "no"


class Candidacy(StrEnum):
    """Whether a candidate stands."""

    STANDING = "standing"
    WITHDRAWN = "withdrawn"


# Around the party and alliance codes, which stand between ``method`` and ``undecided``.
REGISTER_COLUMNS = (
    "poll", "house", "sponsor", "start", "end", "published", "question", "region", "sample", "effective",
    "mode", "population", "method", "undecided", "status", "status_date", "replaces", "use", "why_not",
    "source", "note",
)  # fmt: skip

REGISTER_NEEDED = ("house", "end", "sample")
REGISTER_DATES = ("start", "end", "published", "status_date")

RESULT_COLUMNS = ("seat", "name", "region", "seats", "cluster")

RECORD_NEEDED = ("election", "code", "polled", "result")
RECORD_COLUMNS = (*RECORD_NEEDED, "source", "note")

TRANSFER_NEEDED = ("from", "to", "rate", "sd")
TRANSFER_COLUMNS = (*TRANSFER_NEEDED, "source", "note")

CANDIDATE_NEEDED = ("seat", "code")
CANDIDATE_COLUMNS = (*CANDIDATE_NEEDED, "name", "holder", "status", "status_date", "source", "note")
