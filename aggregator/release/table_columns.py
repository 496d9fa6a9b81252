"""What a schema says about a column and a table, and the usual kinds of column."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import NamedTuple

from aggregator.release.rounding import CHANCE_DECIMALS, SHARE_DECIMALS_TABLE
from aggregator.release.table_words import Kind, Level


class ColumnType(StrEnum):
    """How a column is written and what may stand in it."""

    DATE = "date"
    CODE = "code"
    TEXT = "text"
    WHOLE = "whole number"
    NUMBER = "number"
    YES_NO = "yes or no"


class Bounds(NamedTuple):
    """Smallest and largest value a column may hold."""

    low: float
    high: float


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    name, type, unit, meaning
        As a reader of the table needs them.
    allowed
        The only words that may stand in it; empty where any may.
    bounds
        Smallest and largest value; None where there is none.
    decimals
        Digits after the point; None except for numbers.
    blank
        What a blank cell means; None where no cell may be blank.
    from_register
        Whether the text comes from the desk's files as typed, and so must be made inert in a spreadsheet.
    """

    name: str
    type: ColumnType
    unit: str
    meaning: str
    allowed: tuple[str, ...] = ()
    bounds: Bounds | None = None
    decimals: int | None = None
    blank: str | None = None
    from_register: bool = False


@dataclass(frozen=True)
class TableSchema:
    """One table: where it lies in the release, what a row is, its columns in order."""

    path: str
    one_row_per: str
    columns: tuple[Column, ...]

    @property
    def column_names(self) -> tuple[str, ...]:
        """Names of the columns, in order."""
        return tuple(column.name for column in self.columns)


PERCENT = Bounds(0.0, 100.0)
POINTS = Bounds(-100.0, 100.0)
PROBABILITY = Bounds(0.0, 1.0)
ANY_COUNT = Bounds(0.0, float("inf"))
ANY_NUMBER = Bounds(float("-inf"), float("inf"))


def number_column(
    name: str,
    unit: str,
    meaning: str,
    *,
    decimals: int = SHARE_DECIMALS_TABLE,
    bounds: Bounds | None = PERCENT,
    blank: str | None = None,
) -> Column:
    """Describe a column of numbers."""
    return Column(name, ColumnType.NUMBER, unit, meaning, bounds=bounds, decimals=decimals, blank=blank)


def whole_column(name: str, unit: str, meaning: str, *, blank: str | None = None) -> Column:
    """Describe a column of whole numbers."""
    return Column(name, ColumnType.WHOLE, unit, meaning, bounds=ANY_COUNT, decimals=0, blank=blank)


def typed_column(name: str, meaning: str, *, blank: str | None = None) -> Column:
    """Describe a column of text as the desk typed it."""
    return Column(name, ColumnType.TEXT, "–", meaning, blank=blank, from_register=True)


def date_column(name: str, meaning: str, *, blank: str | None = None) -> Column:
    """Describe a column of days."""
    return Column(name, ColumnType.DATE, "ISO 8601", meaning, blank=blank)


def yes_no_column(name: str, meaning: str, *, blank: str | None = None) -> Column:
    """Describe a column of yes or no."""
    return Column(name, ColumnType.YES_NO, "–", meaning, allowed=("yes", "no"), blank=blank)


def chance_column(name: str, meaning: str, *, blank: str | None = None) -> Column:
    """Describe a column of chances."""
    return number_column(name, "0 to 1", meaning, decimals=CHANCE_DECIMALS, bounds=PROBABILITY, blank=blank)


def points_column(name: str, meaning: str, *, blank: str | None = None) -> Column:
    """Describe a column of differences between shares."""
    return number_column(name, "percentage points", meaning, bounds=POINTS, blank=blank)


CODE = Column("code", ColumnType.CODE, "–", "Party, alliance or `OTH`, as in `contest.toml`")
LEVEL = Column(
    "level",
    ColumnType.TEXT,
    "–",
    "What `code` stands for. `party` and `others` together make the whole; an alliance counts its members "
    "again",
    allowed=tuple(Level),
)
DATE = date_column("date", "The day the estimate is for; for `on_polling_day` the polling day of the region")
KIND = Column(
    "kind",
    ColumnType.TEXT,
    "–",
    "`on_date`: on that day. `on_polling_day`: when people vote, drift until then included",
    allowed=tuple(Kind),
)


def quantile_columns(unit: str, *, of: str, bounds: Bounds, decimals: int, whole: bool) -> tuple[Column, ...]:
    """Describe mean, standard deviation and the published quantiles; those of a count are whole numbers."""
    quantile = whole_column if whole else number_column
    options = {} if whole else {"bounds": bounds, "decimals": decimals}
    words = {"q05": "5 %", "q25": "25 %", "q50": "50 % (the median)", "q75": "75 %", "q95": "95 %"}
    return (
        number_column("mean", unit, f"Mean of {of} over the draws", bounds=bounds, decimals=decimals),
        number_column("sd", unit, "Standard deviation over the draws", bounds=bounds, decimals=decimals),
        *(
            quantile(name, unit, f"{of[0].upper()}{of[1:]} is below this with chance {word}", **options)  # type: ignore[arg-type]
            for name, word in words.items()
        ),
    )
