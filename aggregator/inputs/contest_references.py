"""Lists of codes in ``contest.toml``: each code must exist, and stand once."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem


def check_references(key: str, codes: Sequence[str], *, known: Sequence[str], what: str) -> Iterator[Problem]:
    """Check a list of codes.

    Parameters
    ----------
    key
        Where the list stands, like ``alliance[1].members``.
    known
        The codes there are.
    what
        What they stand for, like "party".
    """
    for i, code in enumerate(codes, start=1):
        place = f"{key}[{i}]"
        if code not in known:
            yield Problem(
                CONTEST_FILE, None, place, f'"{code}"', f"the code of a {what} of this contest",
                did_you_mean(code, known) or f"Add the {what} first, or delete the list.", Rule.CODE_UNKNOWN,
            )  # fmt: skip
        elif code in codes[: i - 1]:
            yield Problem(
                CONTEST_FILE, None, place, f'"{code}" a second time', "each code once",
                "Delete one of the two.", Rule.MEMBERS,
            )  # fmt: skip
