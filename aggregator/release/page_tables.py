"""The tables of the page: rows of the release's tables, put side by side and worded for reading."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from aggregator.release.contents import ReleaseContents
from aggregator.release.headlines import largest_code
from aggregator.release.rounding import (
    chance_text,
    date_text,
    points_text,
    share_interval_text,
    share_text,
    whole_text,
)
from aggregator.release.table_schemas import Kind, Level, Outcome

CLOSEST_SEATS = 12
WORTH_AGES = (0, 7, 14, 30, 60, 90)
RECENT_POLLS = 10


@dataclass(frozen=True)
class PageTable:
    """A table as text.

    Attributes
    ----------
    caption
        What it shows.
    header
        Column headings; the first column heads its rows.
    rows
        Cells as text, one tuple per row.
    words
        Places of the columns that hold words and so stand at the left; all others hold numbers.
    """

    caption: str
    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    words: frozenset[int] = frozenset({0})


def support_table(contents: ReleaseContents) -> PageTable:
    """Support of every code in the country: on the day of the run, and on polling day."""
    rows = contents.tables.support
    country = rows[rows["region"] == ""]
    body = []
    for code in contents.codes:
        now = _last(country, code.code, Kind.ON_DATE)
        then = _last(country, code.code, Kind.ON_POLLING_DAY)
        body.append((code.name, *_mean_and_interval(now), *_mean_and_interval(then)))
    return PageTable(
        "Support in the country, percent of the vote: mean and 90 % interval. An alliance counts its members again.",
        (
            "",
            f"If people voted on {date_text(contents.run_date)}",
            "90 % interval",
            f"On polling day, {date_text(contents.contest.polling_day)}",
            "90 % interval",
        ),
        tuple(body),
    )


def regions_table(contents: ReleaseContents) -> PageTable | None:
    """Support on polling day in every region; None where the contest has none."""
    if not contents.contest.regions:
        return None
    rows = contents.tables.support
    final = rows[rows["kind"] == Kind.ON_POLLING_DAY]
    codes = [code for code in contents.codes if code.level is not Level.ALLIANCE]
    body = []
    for region in contents.contest.regions:
        cells = [
            _mean_and_interval(_last(final[final["region"] == region.code], code.code, Kind.ON_POLLING_DAY))
            for code in codes
        ]
        body.append(
            (region.name, *(f"{mean} ({interval})" if interval else mean for mean, interval in cells))
        )
    return PageTable(
        "Support on polling day by region, percent of the vote: mean and 90 % interval. A dash: does not stand there.",
        ("Region", *(code.name for code in codes)),
        tuple(body),
    )


def seats_table(contents: ReleaseContents) -> PageTable | None:
    """Seats of every code; None where nothing is counted in seats."""
    seats = contents.tables.seats
    if seats is None:
        return None
    body = []
    for code in contents.codes:
        cells = []
        for kind in (Kind.ON_DATE, Kind.ON_POLLING_DAY):
            row = _last(seats, code.code, kind)
            cells += (
                ["–", ""]
                if row is None
                else [whole_text(row["mean"]), f"{whole_text(row['q05'])} to {whole_text(row['q95'])}"]
            )
        body.append((code.name, *cells))
    return PageTable(
        f"Seats of {contents.chamber}; a majority is {contents.majority}. Mean and 90 % interval. An alliance counts its members' seats again.",
        (
            "",
            f"If people voted on {date_text(contents.run_date)}",
            "90 % interval",
            "On polling day",
            "90 % interval",
        ),
        tuple(body),
    )


OUTCOME_WORDS = {
    Outcome.MOST_SUPPORT: "has the most votes",
    Outcome.LARGEST: "has the most seats",
    Outcome.MAJORITY_ALONE: "has a majority alone",
    Outcome.MAJORITY_ONLY_AS_ALLIANCE: "has a majority only as an alliance",
    Outcome.NO_MAJORITY: "No party and no alliance has a majority",
}


def chances_table(contents: ReleaseContents) -> PageTable:
    """Chances on polling day, in the words of the IPCC scale; chances below 1 % are left to the CSV file."""
    chances = contents.tables.chances
    final = chances[(chances["kind"] == Kind.ON_POLLING_DAY) & (chances["probability"] >= 0.01)]
    body = [
        (
            f"{contents.names.get(row.code, '')} {OUTCOME_WORDS[Outcome(row.outcome)]}".strip(),
            chance_text(row.probability),
            row.likelihood,
        )
        for outcome in Outcome
        for row in final[final["outcome"] == outcome]
        .sort_values("probability", ascending=False, kind="stable")
        .itertuples()
    ]
    return PageTable(
        "Chances on polling day. Chances below 1 % are in chances.csv. Words: IPCC likelihood scale.",
        ("Outcome", "Chance", "In words"),
        tuple(body),
        words=frozenset({0, 2}),
    )


def closest_seats_table(contents: ReleaseContents) -> PageTable | None:
    """Seats whose likeliest winner is least sure; None where nothing is counted in seats."""
    table = contents.tables.seat_chances
    if table is None:
        return None
    ordered = table.sort_values(["seat", "chance"], ascending=[True, False], kind="stable")
    first = ordered.groupby("seat", sort=False).nth(0).set_index("seat")
    second = ordered.groupby("seat", sort=False).nth(1).set_index("seat")
    closest = first.sort_values("chance", kind="stable").head(CLOSEST_SEATS)
    body = []
    for seat, row in closest.iterrows():
        next_one = second.loc[seat] if seat in second.index else None
        body.append(
            (
                row["name"] or str(seat),
                contents.region_names.get(row["region"], ""),
                f"{contents.names[row['code']]} {chance_text(row['chance'])}",
                "–"
                if next_one is None
                else f"{contents.names[next_one['code']]} {chance_text(next_one['chance'])}",
            )
        )
    return PageTable(
        f"The {len(body)} seats whose outcome on polling day is least sure, with the two likeliest winners and their chances.",
        ("Seat", "Region", "Likeliest winner", "Next"),
        tuple(body),
        words=frozenset({0, 1, 2, 3}),
    )


def houses_table(contents: ReleaseContents) -> PageTable:
    """Lean of every house by party, with the noise of its polls."""
    codes = [code for code in contents.codes if code.level is Level.PARTY]
    houses = contents.tables.houses
    body = []
    for (house, method), rows in houses.groupby(["house", "method"], sort=False):
        by_code = rows.set_index("code")
        leans = [
            f"{points_text(by_code.loc[code.code, 'lean'])} ({points_text(by_code.loc[code.code, 'q05'])} to "
            f"{points_text(by_code.loc[code.code, 'q95'])})"
            for code in codes
        ]
        one = rows.iloc[0]
        body.append(
            (
                f"{house} ({method})" if method else str(house),
                whole_text(one["polls"]),
                whole_text(one["usual_sample"]),
                f"{one['design_effect']:.1f}",
                *leans,
            )
        )
    return PageTable(
        "Leans in percentage points against the average of the houses, with 90 % intervals. Design effect: how much noisier a poll of "
        "the usual size is than a simple random sample of that size.",
        ("House", "Polls", "Usual sample", "Design effect", *(code.name for code in codes)),
        tuple(body),
    )


def worth_table(contents: ReleaseContents) -> PageTable:
    """What a poll of 1,000 is worth at some ages, for the party with most support."""
    code = largest_code(contents.tables.support, kind=Kind.ON_DATE)
    rows = contents.tables.shelf_life[contents.tables.shelf_life["code"] == code]
    body = [
        (
            f"{int(row.age_days)} days",
            f"{whole_text(row.worth_today)} ({whole_text(row.worth_today_q05)} to {whole_text(row.worth_today_q95)})",
            f"{whole_text(row.worth_polling_day)} ({whole_text(row.worth_polling_day_q05)} to {whole_text(row.worth_polling_day_q95)})",
            share_text(row.expected_error, unit=False),
            share_text(row.error_sampling, unit=False),
            share_text(row.error_house, unit=False),
            share_text(row.error_shared_lean, unit=False),
            share_text(row.error_drift, unit=False),
        )
        for row in rows[rows["age_days"].isin(WORTH_AGES)].itertuples()
    ]
    return PageTable(
        f"A poll of 1,000 by its age, for {contents.names[code]}: respondents it is worth, with 90 % intervals; and the error, in points, to "
        "expect on polling day of a poll taken that many days before it, with its parts (they add up in squares).",
        ("Age", "Worth now", "Worth for polling day", "Error", "Sampling", "House", "Shared lean", "Drift"),
        tuple(body),
    )


def polls_tables(contents: ReleaseContents) -> tuple[PageTable, PageTable | None]:
    """Disclosure of the polls used, latest first: the latest, and the others (None where there are no more)."""
    polls = contents.tables.polls_used.sort_values("end", ascending=False, kind="stable")
    header = (
        "Poll",
        "House",
        "Paid for by",
        "Fieldwork",
        "Published",
        "Regions",
        "Sample",
        "Counted",
        "Mode",
        "Population",
        "Worth now",
        "Source",
    )
    body = tuple(_poll_cells(row) for _, row in polls.iterrows())
    words = frozenset({0, 1, 2, 3, 4, 5, 8, 9, 11})
    latest = PageTable("The latest polls.", header, body[:RECENT_POLLS], words)
    older = (
        PageTable("All other polls.", header, body[RECENT_POLLS:], words)
        if len(body) > RECENT_POLLS
        else None
    )
    return latest, older


def _poll_cells(row: pd.Series) -> tuple[str, ...]:
    start, end = row["start"], row["end"]
    fieldwork = f"{end:%Y-%m-%d}" if pd.isna(start) or start == end else f"{start:%Y-%m-%d} to {end:%Y-%m-%d}"
    return (
        _text(row["poll"]),
        _text(row["house"]),
        _text(row["sponsor"]) or "–",
        fieldwork,
        "–" if pd.isna(row["published"]) else f"{row['published']:%Y-%m-%d}",
        _text(row["regions"]) or "all",
        "–" if pd.isna(row["sample"]) else whole_text(row["sample"]),
        whole_text(row["respondents"]),
        _text(row["mode"]) or "–",
        _text(row["population"]) or "–",
        "–" if pd.isna(row["worth_today"]) else whole_text(row["worth_today"]),
        _text(row["source"]) or "–",
    )


def _text(cell: object) -> str:
    return "" if cell is None or (isinstance(cell, float) and cell != cell) else str(cell)


def _last(rows: pd.DataFrame, code: str, kind: Kind) -> pd.Series | None:
    found = rows[(rows["code"] == code) & (rows["kind"] == kind)]
    return None if found.empty else found.loc[found["date"].idxmax()]


def _mean_and_interval(row: pd.Series | None) -> tuple[str, str]:
    if row is None:
        return "–", ""
    return share_text(row["mean"]), share_interval_text(row["q05"], row["q95"])
