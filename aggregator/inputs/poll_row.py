"""One row of the poll register, read and typed."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

from aggregator.inputs.register_columns import Question, Status, Use


@dataclass(frozen=True, slots=True)
class PollRow:
    """A poll, or one region of it, as the register has it.

    Attributes
    ----------
    row
        Row of the file as a spreadsheet counts it.
    poll
        Identifier; made from house and end date where the cell is blank.
    regions
        Region codes asked in; all of them for a national row.
    national
        Whether the row covers the whole country.
    shares
        Percent by party or alliance code, filled cells only, as reported.
    undecided
        Percent; None where the cell is blank.
    use
        The desk's decision; None where the cell is blank.
    """

    row: int
    poll: str
    house: str
    sponsor: str
    start: date
    end: date
    published: date
    question: Question
    regions: tuple[str, ...]
    national: bool
    sample: float | None
    effective: float | None
    mode: str
    population: str
    method: str
    shares: dict[str, float]
    undecided: float | None
    status: Status
    status_date: date | None
    replaces: str
    use: Use | None
    why_not: str
    source: str
    note: str
    start_given: bool
    published_given: bool

    @property
    def wants_in(self) -> bool:
        """Whether the row is a vote question that the desk has not left out."""
        return self.question is Question.VOTE and self.use is not Use.NO
