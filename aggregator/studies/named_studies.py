"""What a command calls the sizes of invented elections, and what may go wrong in them."""

from __future__ import annotations

from collections.abc import Mapping

from aggregator.errors import UsageError
from data_demo.all_violations import VIOLATIONS
from data_demo.made_up_election import SMALL_ELECTION, UNTIDY_ELECTION, ElectionSize
from data_demo.made_up_violation import Violation

SIZES: Mapping[str, ElectionSize] = {
    "small": SMALL_ELECTION,
    "whole": ElectionSize(),
    "untidy": UNTIDY_ELECTION,
}
"""Small: few of everything. Whole: a usual register. Untidy: with all that makes one hard to read."""


def size_called(name: str) -> ElectionSize:
    """Give the size of that name.

    Raises
    ------
    UsageError
        If there is none.
    """
    if name not in SIZES:
        raise UsageError(f"--size {name} is unknown; there are {', '.join(SIZES)}.")
    return SIZES[name]


def violation_called(name: str) -> Violation:
    """Give the violation of that name.

    Raises
    ------
    UsageError
        If there is none.
    """
    if name not in VIOLATIONS:
        raise UsageError(f"--violation {name} is unknown; there are {', '.join(VIOLATIONS)}.")
    return VIOLATIONS[name]
