"""The tables of a release as the documentation shows them."""

from __future__ import annotations

from aggregator.release.table_columns import Column, TableSchema


def describe_schema(schema: TableSchema) -> str:
    """Write a table's schema as Markdown; ``docs/formats.md`` holds this text word for word.

    Parameters
    ----------
    schema
        The table.
    """
    lines = [
        f"#### {schema.path}",
        "",
        f"One row per {schema.one_row_per}.",
        "",
        "| column | type | unit | meaning |",
        "| --- | --- | --- | --- |",
        *(_describe_column(column) for column in schema.columns),
    ]
    return "\n".join(lines) + "\n"


def _describe_column(column: Column) -> str:
    meaning = column.meaning
    if column.allowed:
        meaning += ". One of " + ", ".join(f"`{word}`" for word in column.allowed)
    if column.blank is not None:
        meaning += f". Blank: {column.blank}"
    if column.from_register:
        meaning += ". †"
    return f"| `{column.name}` | {_describe_type(column)} | {column.unit} | {meaning} |"


def _describe_type(column: Column) -> str:
    if not column.decimals:
        return str(column.type)
    return f"{column.type}, {column.decimals} decimals"
