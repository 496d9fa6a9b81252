"""Other assumptions as page and note set them out: a table, and the shared lean in words."""

from __future__ import annotations

from collections.abc import Hashable, Mapping
from typing import Any

import pandas as pd

from aggregator.release.assumptions_table import parties_that_matter
from aggregator.release.contents import ReleaseContents
from aggregator.release.page_tables import PageTable
from aggregator.release.rounding import chance_text, share_interval_text, share_text, whole_text

PARTIES_SHOWN = 3
NEEDS_A_FIT = "needs another fit"
IN_USE = "in use"
"""The setting of the size that the run itself stands on."""
WITHOUT_LEAN = "none"
"""How the setting begins in which polls share no error."""

type Row = dict[Hashable, Any]


def assumptions_table(contents: ReleaseContents) -> PageTable | None:
    """Set out polling day under every setting; None where no other setting was worked out."""
    table = contents.tables.assumptions
    if table.empty:
        return None
    shown = parties_that_matter(table, most=PARTIES_SHOWN)
    names = [contents.names[code] for code in shown]
    seats = bool(table["seats_mean"].notna().any())
    body = []
    for (assumption, setting), rows in table.groupby(["assumption", "setting"], sort=False):
        by_code = {row["code"]: row for row in rows.to_dict("records")}
        used = rows["in_use"].iloc[0] == "yes"
        if used and setting == IN_USE:
            # The run itself stands in the table already, under the correlation it assumes.
            continue
        cells = [_support(by_code[code]) for code in shown]
        if seats:
            first = by_code[shown[0]]
            cells += [_seats(first), _chance(first["largest"]), _chance(first["majority_alone"])]
        body.append((_assumed(str(assumption), str(setting), used=used), *cells))
    header = ["Assumption", *names]
    if seats:
        header += [f"{names[0]}: {what}" for what in ("seats", "most seats", "majority")]
    return PageTable(
        f"Polling day under other assumptions about the error that all polls share{_and_swing(table)}. "
        "Support in percent of the vote, mean and 90 % interval below it; chances of the party with most "
        "support. Nothing in the polls says which line is right.",
        tuple(header),
        tuple(body),
    )


def _and_swing(table: pd.DataFrame) -> str:
    swing = table["assumption"].str.contains("seats").any()
    return " and about how a region's move reaches its seats" if swing else ""


def shared_lean_sentences(contents: ReleaseContents) -> list[str]:
    """Say how large the shared lean in use is, where that comes from, and what holds without it."""
    size = contents.settings.get("shared_lean")
    if not contents.contest.model.shared_lean or not isinstance(size, Mapping):
        return []
    return [*_size_sentences(size, contents), *_without_lean(contents)]


def _size_sentences(size: Mapping[str, Any], contents: ReleaseContents) -> list[str]:
    points = {code: round(float(value), 1) for code, value in size["points_at_40"].items()}
    usual = round(float(contents.contest.model.shared_lean_points), 1)
    sizes = sorted(set(points.values()))
    record = contents.inputs.past_errors
    by_party = "; ".join(f"{contents.names[code]} {value}" for code, value in points.items())
    sentences = [
        f"The error that all polls share has a standard deviation of {sizes[0]} points for a party at 40 %."
        if len(sizes) == 1
        else f"The error that all polls share has, for a party at 40 %, a standard deviation in points of: "
        f"{by_party}."
    ]
    if record is not None and not record.empty:
        sentences.append(
            f"The desk's own record of {_counted(record['election'].nunique(), 'earlier election')} moved it "
            f"from the published {usual}."
        )
    undecided = float(size["late_undecided"])
    if undecided > 0:
        sentences.append(
            f"The undecided of late polls, {share_text(100 * undecided)} on average, are in it: they may "
            "break otherwise than those who chose, which adds "
            f"{'less than 0.1' if size['undecided_adds'] < 0.1 else format(size['undecided_adds'], '.1f')} "
            "points."
        )
    return sentences


def _without_lean(contents: ReleaseContents) -> list[str]:
    table = contents.tables.assumptions
    without = table[table["setting"].str.startswith(WITHOUT_LEAN) & table["mean"].notna()]
    if without.empty:
        return []
    code = parties_that_matter(table, most=1)[0]
    used = table[(table["code"] == code) & (table["in_use"] == "yes")].iloc[0]
    bare = without[without["code"] == code].iloc[0]
    return [
        f"Without it the 90 % interval of {contents.names[code]} on polling day would be "
        f"{share_interval_text(bare['q05'], bare['q95'])} and not "
        f"{share_interval_text(used['q05'], used['q95'])}: too narrow, if the past is a guide."
    ]


def _support(row: Row) -> str:
    if pd.isna(row["mean"]):
        return NEEDS_A_FIT
    return f"{share_text(row['mean'])}\n{share_interval_text(row['q05'], row['q95'])}"


def _seats(row: Row) -> str:
    if pd.isna(row["seats_mean"]):
        return "–"
    return (
        f"{whole_text(row['seats_mean'])}\n{whole_text(row['seats_q05'])} to {whole_text(row['seats_q95'])}"
    )


def _chance(value: float) -> str:
    return "–" if pd.isna(value) else chance_text(value)


def _assumed(assumption: str, setting: str, *, used: bool) -> str:
    """Name a line of the table: the setting, below it what it is a setting of."""
    name = f"{setting}, in use" if used else setting
    return f"{name[:1].upper()}{name[1:]}\n{assumption}"


def _counted(number: int, noun: str) -> str:
    return f"{number} {noun}" + ("" if number == 1 else "s")
