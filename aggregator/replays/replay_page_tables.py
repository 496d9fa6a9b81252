"""The tables of a replay's page: rows of its tables, put side by side and worded for reading."""

from __future__ import annotations

from collections.abc import Hashable
from typing import Any

import pandas as pd

from aggregator.release.page_tables import PageTable
from aggregator.release.rounding import points_text, share_interval_text, share_text, whole_text
from aggregator.release.table_words import Level
from aggregator.replays.distribution_scores import INTERVALS
from aggregator.replays.methods import (
    EVERY_LEAD,
    LEADS,
    METHOD_NAMES,
    RIVALS,
    Method,
    Nearer,
    Quantity,
    Where,
)
from aggregator.replays.replay_words import COMPARED, UNIT, days_text, named, summary_row
from aggregator.replays.report_contents import ReportContents

_VERDICTS = {
    Nearer.FIELDFOLD: "model nearer",
    Nearer.RIVAL: "rival nearer",
    Nearer.NO_CLEAR_DIFFERENCE: "no clear difference",
}
SHOWN_METHODS = (Method.FIELDFOLD, Method.LATEST_POLL, Method.MEAN_30_DAYS, Method.DECAYING_MEAN)


def last_day_tables(contents: ReportContents) -> list[PageTable]:
    """Set out the last replayed day beside the result: support, then seats; none for several contests."""
    if contents.is_pooled:
        return []
    quantities = (Quantity.SUPPORT, Quantity.SEATS) if contents.has_seats else (Quantity.SUPPORT,)
    return [_last_day_table(contents, quantity) for quantity in quantities]


def _last_day_table(contents: ReportContents, quantity: Quantity) -> PageTable:
    rows = contents.last_day
    rows = rows[rows["quantity"] == quantity]
    by_code = {row["code"]: row for row in rows.to_dict("records")}
    days = days_text(int(rows["days_before"].iloc[0]))
    support = quantity is Quantity.SUPPORT
    body = []
    for look in contents.looks:
        if look.code in by_code:
            row = by_code[look.code]
            body.append(
                (
                    look.name,
                    _figure(row["estimate"], support)
                    + "\n"
                    + _interval(row["low_90"], row["high_90"], support),
                    _figure(row["truth"], support),
                    points_text(row["error"]) if support else _signed_whole(row["error"]),
                    "yes" if row["inside_90"] == 1 else "no",
                )
            )
    return PageTable(
        f"{'Support' if support else 'Seats'}, {days[0].lower()}{days[1:]} before polling day: mean, 90 % "
        "interval below it, and the result. An alliance is the sum of its members.",
        ("", "Estimate", "Result", "Error", "Inside 90 %"),
        tuple(body),
    )


def _figure(value: float, support: bool) -> str:
    return share_text(value) if support else whole_text(value)


def _interval(low: float, high: float, support: bool) -> str:
    return share_interval_text(low, high) if support else f"{whole_text(low)} to {whole_text(high)}"


def _signed_whole(value: float) -> str:
    number = round(value)
    return f"{'+' if number > 0 else '−' if number < 0 else ''}{abs(number)}"


def error_table(contents: ReportContents, *, quantity: Quantity, where: Where) -> PageTable | None:
    """Set out mean absolute errors by method and days before polling day; None where there are none."""
    leads = leads_with_rows(contents)
    body = []
    for method in Method:
        cells = [
            summary_row(contents.summary, method=method, quantity=quantity, where=where, lead=lead)
            for lead in leads
        ]
        if any(cell is not None for cell in cells):
            name = METHOD_NAMES[method]
            body.append(
                (
                    f"{name[0].upper()}{name[1:]}",
                    *("–" if c is None else share_text(c["mean_absolute_error"], unit=False) for c in cells),
                )
            )
    if not body:
        return None
    return PageTable(
        f"Mean absolute error of {named(quantity, where)}, in {UNIT[quantity]}, by days before polling day. "
        "Parties and others; every figure counts the same.",
        ("", *(f"{lead} days" for lead in leads)),
        tuple(body),
    )


def leads_with_rows(contents: ReportContents) -> list[str]:
    """Bands of days before polling day that were replayed, nearest first."""
    present = set(contents.summary["lead"])
    return [lead.label for lead in LEADS if lead.label in present]


def comparison_table(contents: ReportContents, *, quantity: Quantity, where: Where) -> PageTable | None:
    """Set out every rival against this program by days before polling day; None where there is no rival."""
    table = contents.comparisons
    here = table[(table["quantity"] == quantity) & (table["where"] == where)]
    if here.empty:
        return None
    leads = [lead for lead in leads_with_rows(contents) if (here["lead"] == lead).any()]
    body = []
    for rival in RIVALS:
        rows = {row["lead"]: row for row in here[here["rival"] == rival].to_dict("records")}
        if rows:
            name = METHOD_NAMES[rival]
            cells = (_comparison_cell(rows[lead]) if lead in rows else "–" for lead in leads)
            body.append((f"{name[0].upper()}{name[1:]}", *cells))
    return PageTable(
        f"{named(quantity, where).capitalize()}: mean absolute error of the rival, then of this model on "
        f"the same days, in {UNIT[quantity]}.",
        ("Rival", *(f"{lead} days" for lead in leads)),
        tuple(body),
    )


def _comparison_cell(row: dict[Hashable, Any]) -> str:
    rival, own = share_text(row["rival_error"], unit=False), share_text(row["own_error"], unit=False)
    return f"{rival} : {own}\n{_VERDICTS[Nearer(row['nearer'])]}"


def coverage_table(contents: ReportContents) -> PageTable:
    """Set out how often this program's intervals held, and how wide they were."""
    body = []
    for quantity, where in COMPARED:
        for lead in leads_with_rows(contents):
            row = summary_row(
                contents.summary, method=Method.FIELDFOLD, quantity=quantity, where=where, lead=lead
            )
            if row is None or (where is Where.REGIONS and lead != EVERY_LEAD.label):
                continue
            text = named(quantity, where)
            body.append(
                (
                    f"{text[0].upper()}{text[1:]}\n{lead} days",
                    whole_text(row["dates"]),
                    *(f"{whole_text(row[f'inside_{percent}'])} %" for percent in INTERVALS),
                    share_text(row["width_90"], unit=False),
                )
            )
    return PageTable(
        "How often this model's intervals held the result, by days before polling day, and the mean width "
        "of the 90 % interval. Intervals of whole seats hold at least their share.",
        ("", "Dates", *(f"{percent} % interval" for percent in INTERVALS), "Width of 90 %"),
        tuple(body),
    )


def seat_score_table(contents: ReportContents) -> PageTable | None:
    """Set out scores of chances in single seats by method; None where there are none."""
    table = contents.seat_scores
    if table.empty:
        return None
    body = []
    for method in Method:
        rows = table[table["method"] == method]
        if len(rows):
            name = METHOD_NAMES[method]
            log = rows["log_score"].mean()
            body.append(
                (
                    f"{name[0].upper()}{name[1:]}",
                    f"{rows['brier'].mean():.3f}",
                    "–" if pd.isna(log) else f"{log:.3f}",
                    f"{rows['leaders_wrong'].mean():.1f}",
                    f"{rows['seats'].mean():.0f}",
                )
            )
    return PageTable(
        "Single seats, mean over replayed days: Brier score (0 to 2) and log score of the chances, smaller "
        "is better, and seats whose likeliest winner lost. A rival is always sure, so that it has no log "
        "score.",
        ("", "Brier score", "Log score", "Called wrong", "Seats"),
        tuple(body),
    )


def by_size_table(contents: ReportContents) -> PageTable | None:
    """Set out errors by size of party; None for a single contest."""
    if not contents.is_pooled:
        return None
    table = contents.by_size
    leads = leads_with_rows(contents)
    body = []
    for (first, last), rows in table.groupby(["size_from", "size_to"]):
        for method in SHOWN_METHODS:
            own = {row["lead"]: row for row in rows[rows["method"] == method].to_dict("records")}
            if own:
                cells = (
                    f"{share_text(own[lead]['mean_absolute_error'], unit=False)}" if lead in own else "–"
                    for lead in leads
                )
                body.append((f"{first:.0f} to {last:.0f} %\n{METHOD_NAMES[method]}", *cells))
    return PageTable(
        "Mean absolute error of support in the country, in points, by size of party as this model "
        "estimated it and days before polling day; each contest counts once.",
        ("Party of", *(f"{lead} days" for lead in leads)),
        tuple(body),
    )


def staleness_table(contents: ReportContents) -> PageTable | None:
    """Set out measured and expected errors for all parties together; None where nothing was measured."""
    rows = contents.staleness[
        (contents.staleness["code"] == "") & (contents.staleness["level"] != Level.ALLIANCE)
    ]
    if rows.empty:
        return None

    def text(value: float) -> str:
        return "–" if pd.isna(value) else share_text(value, unit=False)

    body = tuple(
        (
            f"{row['days_from']:.0f} to {row['days_to']:.0f} days",
            whole_text(row["polls"]),
            "–" if pd.isna(row["sample"]) else whole_text(row["sample"]),
            text(row["poll_error"]),
            text(row["expected_error"]),
            whole_text(row["estimates"]),
            text(row["estimate_error"]),
            text(row["estimate_expected"]),
        )
        for row in rows.to_dict("records")
    )
    return PageTable(
        "Root mean square error over parties, in points, by days to polling day: single polls with their "
        "median sample; what the formula expects of a poll of 1,000; this model's estimates, and the error "
        "they claimed.",
        ("To polling day", "Polls", "Sample", "Error", "Formula", "Estimates", "Error", "As claimed"),
        body,
    )
