"""The charts about seats: on polling day, over time, together, seat by seat, and against votes."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import pandas as pd

from aggregator.release.chamber import Chamber
from aggregator.release.chart_style import CHART_READING, CodeLook
from aggregator.release.combination_words import combination_text
from aggregator.release.combinations_chart import build_combinations_chart
from aggregator.release.contents import ReleaseContents
from aggregator.release.deciding_seats_chart import build_deciding_seats_chart
from aggregator.release.interval_charts import build_seats_chart
from aggregator.release.over_time_chart import OverTime, build_over_time_chart
from aggregator.release.release_chart import ReleaseChart, silence_everywhere, silence_reading, with_alarms
from aggregator.release.rounding import chance_text, date_text, share_text, whole_text
from aggregator.release.seats_rows import (
    codes_nearest_the_line,
    deciding_seats_of,
    likeliest_combinations,
    seat_name,
    share_for_majority,
    slope_row,
)
from aggregator.release.seats_votes_chart import SeatsVotesPanel, build_seats_votes_chart
from aggregator.release.table_rows import last_row
from aggregator.release.table_words import Kind, Level

COMBINATIONS_SHOWN = 10
CODES_SHOWN = 4
SEATS_SHOWN = 8


def build_seats_charts(contents: ReleaseContents, looks: dict[str, CodeLook]) -> Iterator[ReleaseChart]:
    """All charts about seats there are; none where nothing is counted in seats."""
    tables, chamber = contents.tables, contents.chamber
    if tables.seats is None or chamber is None:
        return
    yield _seats_chart(contents, looks, tables.seats, chamber)
    yield _seats_over_time_chart(contents, looks, tables.seats, chamber)
    if tables.combinations is not None and len(
        rows := likeliest_combinations(tables.combinations, most=COMBINATIONS_SHOWN)
    ):
        yield _combinations_chart(contents, looks, rows, chamber)
    if tables.deciding_seats is not None and len(tables.deciding_seats):
        yield _deciding_seats_chart(contents, looks, tables.deciding_seats, chamber)
    if tables.seats_votes is not None:
        yield _seats_votes_chart(contents, looks, tables.seats_votes, chamber)


def _line_reading(chamber: Chamber) -> str:
    """Say that the line is no single number, where it is none."""
    return (
        f" Overhang seats move the majority line; shown is its middle. {chamber.sentence}"
        if chamber.line_moves
        else ""
    )


def _seats_chart(
    contents: ReleaseContents, looks: dict[str, CodeLook], seats: pd.DataFrame, chamber: Chamber
) -> ReleaseChart:
    chosen = list(looks.values())
    title = f"Seats on polling day, {date_text(contents.contest.last_polling_day)}"
    return ReleaseChart(
        name="seats_on_polling_day",
        title=title,
        reading="Shape: mean; thick line: 50 % interval; thin line: 90 % interval. "
        f"Numbers: mean and 90 % interval. An alliance is the sum of its members.{_line_reading(chamber)}",
        alt_text=_seats_alt_text(f"{title}. {chamber.sentence}", seats, chosen, contents),
        draw=lambda layout: build_seats_chart(seats, looks=chosen, chamber=chamber, layout=layout),
    )


def _seats_over_time_chart(
    contents: ReleaseContents, looks: dict[str, CodeLook], seats: pd.DataFrame, chamber: Chamber
) -> ReleaseChart:
    chosen = [looks[code.code] for code in contents.codes if code.level is not Level.ALLIANCE]
    title = "Seats if people had voted on each date, and on polling day"
    content = OverTime(
        rows=seats,
        looks=chosen,
        unit="seats",
        decimals=0,
        run_date=contents.run_date,
        polling_day=contents.contest.last_polling_day,
        line_at=chamber.middle_line,
        line_label=f"majority: {'about ' if chamber.line_moves else ''}{chamber.middle_line}",
        silence=silence_everywhere(contents),
    )
    return ReleaseChart(
        name="seats_over_time",
        title=title,
        reading=f"{CHART_READING}{silence_reading(contents)}{_line_reading(chamber)}",
        alt_text=_seats_alt_text(f"{title}. {chamber.sentence}", seats, chosen, contents),
        draw=lambda layout: build_over_time_chart(content, layout=layout),
    )


def _seats_alt_text(
    opening: str, seats: pd.DataFrame, looks: Iterable[CodeLook], contents: ReleaseContents
) -> str:
    found = ((look, last_row(seats, code=look.code, kind=Kind.ON_POLLING_DAY)) for look in looks)
    parts = [
        f"{look.name} {whole_text(row['mean'])} ({whole_text(row['q05'])} to {whole_text(row['q95'])})"
        for look, row in found
        if row is not None
    ]
    return with_alarms(f"{opening} Mean and 90 % interval on polling day: {'; '.join(parts)}.", contents)


def _combinations_chart(
    contents: ReleaseContents, looks: dict[str, CodeLook], rows: pd.DataFrame, chamber: Chamber
) -> ReleaseChart:
    title = "Who reaches a majority, alone or together, on polling day"
    listed = [
        f"{combination_text(row['combination'], contents.names)} {chance_text(row['chance'])}, "
        f"{whole_text(row['mean'])} seats ({whole_text(row['q05'])} to {whole_text(row['q95'])})"
        for row in rows.to_dict("records")
    ]
    return ReleaseChart(
        name="combinations",
        title=title,
        reading="In each row, parties that can reach the majority line together and may need every one of "
        "them for it. Dot and line: mean and 90 % interval of their seats; number: chance of reaching the "
        "line. Shown are those that most often need every party, and alliances. "
        f"Arithmetic only: nothing is said of who would work with whom.{_line_reading(chamber)}",
        alt_text=with_alarms(
            f"{title}. {chamber.sentence} Chance, mean of seats, 90 % interval: {'; '.join(listed)}.",
            contents,
        ),
        draw=lambda layout: build_combinations_chart(rows, looks=looks, chamber=chamber, layout=layout),
    )


def _deciding_seats_chart(
    contents: ReleaseContents, looks: dict[str, CodeLook], table: pd.DataFrame, chamber: Chamber
) -> ReleaseChart:
    codes = codes_nearest_the_line(contents.tables, chamber=chamber, most=CODES_SHOWN)
    panels = [(looks[code], deciding_seats_of(table, code=code, most=SEATS_SHOWN)) for code in codes]
    title = "The seats that decide a majority"
    listed = [
        f"{look.name}: "
        + ", ".join(
            f"{seat_name(row)} {share_text(100 * row['decides'])} (wins it: {chance_text(row['chance'])})"
            for row in rows.head(3).to_dict("records")
        )
        for look, rows in panels
    ]
    return ReleaseChart(
        name="deciding_seats",
        title=title,
        reading="With the seats of a party or alliance in the order of its lead there, the one with which it "
        "reaches the majority line decides. Bar: chance that it is this seat. Number: chance of winning it. "
        "Shown are the parties and alliances nearest to the line.",
        alt_text=with_alarms(
            f"{title}. The likeliest, with the chance that they decide: {'; '.join(listed)}.", contents
        ),
        draw=lambda layout: build_deciding_seats_chart(panels, layout=layout),
    )


def _seats_votes_chart(
    contents: ReleaseContents, looks: dict[str, CodeLook], table: pd.DataFrame, chamber: Chamber
) -> ReleaseChart:
    seats = contents.tables.seats
    title = "Seats against votes on polling day"
    codes = codes_nearest_the_line(
        contents.tables, chamber=chamber, most=CODES_SHOWN, among=set(table["code"])
    )
    panels, listed = [], []
    for code in codes:
        row = None if seats is None else last_row(seats, code=code, kind=Kind.ON_POLLING_DAY)
        slope = slope_row(table, code=code)
        panels.append(
            SeatsVotesPanel(
                look=looks[code],
                curve=table[(table["code"] == code) & (table["what"] == "curve")],
                votes=float(slope["votes"]),
                seats=float("nan") if row is None else float(row["mean"]),
            )
        )
        needed = share_for_majority(table, code=code, line=chamber.middle_line)
        listed.append(
            f"{looks[code].name} at {share_text(slope['votes'])} gains {slope['mean']:.1f} seats a point"
            + (
                f" and has a majority from about {share_text(needed)}"
                if needed is not None and not chamber.line_moves
                else ""
            )
        )
    return ReleaseChart(
        name="seats_against_votes",
        title=title,
        reading="What a party or alliance would hold with more or fewer votes, where others make room. "
        "Line: mean; band: 90 % interval; shape: where it is expected. Across: the majority line."
        f"{_line_reading(chamber)}",
        alt_text=with_alarms(f"{title}. {chamber.sentence} {'; '.join(listed)}.", contents),
        draw=lambda layout: build_seats_votes_chart(panels, chamber=chamber, layout=layout),
    )
