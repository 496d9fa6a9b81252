"""One finding about one place in one file, and the report of all of them."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from enum import StrEnum


class Severity(StrEnum):
    """Whether a finding stops the run or travels into the release."""

    ERROR = "error"
    WARNING = "warning"


@dataclass(frozen=True, order=True)
class Problem:
    """A finding: where it is, what was found, what was expected, what to do.

    Attributes
    ----------
    file
        Name of the file inside the contest folder.
    row
        Row as a spreadsheet counts it (the header is row 1), None where the finding has no row.
    column
        Column name, or the key path in a TOML file (``party[2].code``).
    rule
        Number of the reading rule, as listed in ``docs/reading_rules.md``.
    """

    file: str
    row: int | None
    column: str | None
    found: str
    expected: str
    remedy: str
    rule: str
    severity: Severity = Severity.ERROR

    def __str__(self) -> str:
        """One line: place, found, expected, what to do."""
        place = self.file
        if self.row is not None:
            place += f", row {self.row}"
        if self.column is not None:
            place += f", {'key' if self.file.endswith('.toml') else 'column'} {self.column}"
        return f"{place}: found {self.found}; expected {self.expected}. {self.remedy} [{self.rule}]"


def problem_report(problems: Iterable[Problem]) -> str:
    """All findings as text, errors first, one line each."""
    found = list(problems)
    errors = [p for p in found if p.severity is Severity.ERROR]
    warnings = [p for p in found if p.severity is Severity.WARNING]
    lines = [f"{len(errors)} error(s), {len(warnings)} warning(s)"]
    lines += [f"  error    {p}" for p in errors]
    lines += [f"  warning  {p}" for p in warnings]
    return "\n".join(lines)
