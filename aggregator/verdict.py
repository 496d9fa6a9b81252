"""A judgement and the numbers it rests on, kept together."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd


@dataclass(frozen=True)
class Verdict:
    """Whether a set of checks passed, each check's numbers, and the sentence that says so.

    Attributes
    ----------
    passed
        Whether every check passed.
    table
        One row per check. Columns: ``check`` (name), ``value`` (what was measured), ``limit`` (what it is
        held against), ``passed``, ``meaning`` (what a failure would mean for the reader).
    text
        One sentence for a reader who does not look at the table.
    """

    passed: bool
    table: pd.DataFrame
    text: str
