"""How much of each headline number is data and how much assumption, as the note sets it out."""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass
from typing import Any

from aggregator.release.contents import ReleaseContents
from aggregator.release.rounding import date_text

SENSITIVE_FROM = 0.05
"""Kallioinen et al. (2024): a number whose distance is above this moves with the part that was scaled."""

PARTS = {"shared_lean": "the shared error", "prior": "priors of scales", "polls": "the polls"}


@dataclass(frozen=True)
class Grounds:
    """A sentence about the first number on polling day, and one row of text per number."""

    lead: str
    rows: tuple[tuple[str, ...], ...]


def describe_grounds(contents: ReleaseContents) -> Grounds | None:
    """Set out what each headline number rests on; None where it was not worked out."""
    table = contents.tables.prior_sensitivity
    if table is None or table.empty:
        return None
    final = table[table["quantity"] == "support_on_polling_day"]
    return Grounds(
        lead=str((final if len(final) else table)["words"].iloc[0]),
        rows=tuple(_row(row, contents) for row in table.to_dict("records")),
    )


def _row(row: dict[Hashable, Any], contents: ReleaseContents) -> tuple[str, ...]:
    what = {
        "support_on_date": f"support on {date_text(contents.run_date)}",
        "support_on_polling_day": "support on polling day",
        "seats_on_polling_day": "seats on polling day",
    }[row["quantity"]]
    moves = [words for part, words in PARTS.items() if row[part] >= SENSITIVE_FROM]
    return (
        f"{contents.names[row['code']]}, {what}",
        *(f"{row[part]:.0f} %" for part in ("variance_shared_lean", "variance_drift", "variance_polls")),
        ", ".join(moves) or "–",
    )
