"""Tables to CSV: checked against their schema, rounded by it, and inert in a spreadsheet."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd

from aggregator.errors import FieldfoldError
from aggregator.release.table_columns import Column, ColumnType, TableSchema
from aggregator.release.table_schemas import CAUTION

STARTS_A_FORMULA = ("=", "+", "-", "@", "\t", "\r")
"""What makes a spreadsheet run a cell instead of showing it (OWASP, CSV Injection)."""


class SchemaError(FieldfoldError):
    """A table does not hold what its schema says: a mistake in the program."""


def round_table(table: pd.DataFrame, *, schema: TableSchema) -> pd.DataFrame:
    """Numbers as they are published: what page, charts and sentences say is taken from these."""
    decimals = {c.name: c.decimals for c in schema.columns if c.decimals is not None}
    rounded = table.copy()
    for name, digits in decimals.items():
        # Adding zero turns a rounded -0.0 into 0.0, which would otherwise read "-0.00".
        rounded[name] = pd.to_numeric(rounded[name]).astype(float).round(digits) + 0.0
    return rounded


def check_table(table: pd.DataFrame, *, schema: TableSchema) -> None:
    """Compare a table with its schema.

    Raises
    ------
    SchemaError
        If columns are missing, extra or out of order, or a cell holds what its column does not allow.
    """
    if tuple(table.columns) != schema.column_names:
        raise SchemaError(
            f"{schema.path}: columns are {list(table.columns)}; the schema has {list(schema.column_names)}"
        )
    faults = [fault for column in schema.columns for fault in _column_faults(table[column.name], column)]
    if faults:
        raise SchemaError(f"{schema.path}: " + "; ".join(faults))


def _column_faults(cells: pd.Series, column: Column) -> Iterator[str]:
    label = f"column {column.name}"
    blank = cells.isna()
    if not pd.api.types.is_numeric_dtype(cells) and column.type is not ColumnType.DATE:
        blank |= cells.astype(str) == ""
    filled = cells[~blank]
    if column.blank is None and bool(blank.any()):
        first = int(np.argmax(blank.to_numpy())) + 1
        yield f"{label} has {int(blank.sum())} blank cell(s), the first in data row {first}"
    if column.allowed:
        strange = sorted(set(filled.astype(str)) - set(column.allowed))
        if strange:
            yield f"{label} holds {strange}, allowed are {list(column.allowed)}"
    if column.type is ColumnType.DATE and not pd.api.types.is_datetime64_any_dtype(cells):
        yield f"{label} holds {cells.dtype}, not dates"
    if column.bounds is not None and len(filled):
        low, high = filled.astype(float).min(), filled.astype(float).max()
        if low < column.bounds.low or high > column.bounds.high:
            yield f"{label} runs from {low} to {high}, outside {column.bounds.low} to {column.bounds.high}"


def inert_cell(text: str) -> str:
    """Put an apostrophe before a text that a spreadsheet would run as a formula."""
    return f"'{text}" if text.startswith(STARTS_A_FORMULA) else text


def csv_text(table: pd.DataFrame, *, schema: TableSchema, caution: str | None) -> str:
    """Write a checked table as CSV text.

    Parameters
    ----------
    table
        With the schema's columns, rounded.
    schema
        Gives the form of every column.
    caution
        Fills the column ``caution`` at the right end; None where the release's checks passed.
    """
    written = pd.DataFrame({column.name: _cells(table[column.name], column) for column in schema.columns})
    if caution is not None:
        written[CAUTION.name] = caution
    return written.to_csv(index=False, lineterminator="\n")


def _cells(cells: pd.Series, column: Column) -> list[str]:
    if column.type is ColumnType.DATE:
        return cells.dt.strftime("%Y-%m-%d").fillna("").tolist()
    if column.decimals is not None:
        return [
            "" if np.isnan(value) else f"{value:.{column.decimals}f}" for value in cells.to_numpy(np.float64)
        ]
    texts = ["" if pd.isna(cell) else str(cell) for cell in cells]
    return [inert_cell(text) for text in texts] if column.from_register else texts


def write_table(folder: Path, *, table: pd.DataFrame, schema: TableSchema, caution: str | None) -> None:
    """Check a table and write it below a release folder, at the schema's path.

    Raises
    ------
    SchemaError
        If the table does not hold what its schema says; nothing is written then.
    """
    check_table(table, schema=schema)
    path = folder / schema.path
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(csv_text(table, schema=schema, caution=caution), encoding="utf-8")
