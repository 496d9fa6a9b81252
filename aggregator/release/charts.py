"""The charts of a release, each with its reading help and an alt text that holds the numbers."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Any

import altair as alt
import pandas as pd

from aggregator.inputs.contest import Silence
from aggregator.release.chart_style import CHART_READING, CodeLook, Frame, Layout, code_looks, frame_chart
from aggregator.release.contents import ReleaseContents
from aggregator.release.headlines import POLL_SIZE
from aggregator.release.interval_charts import build_houses_chart, build_seats_chart
from aggregator.release.lean_page_tables import era_name
from aggregator.release.over_time_chart import OverTime, build_over_time_chart
from aggregator.release.page_tables import WORTH_AGES
from aggregator.release.poll_points import build_poll_points
from aggregator.release.rounding import date_text, points_text, share_interval_text, share_text, whole_text
from aggregator.release.table_rows import largest_code, last_row
from aggregator.release.table_words import Kind, Level
from aggregator.release.worth_chart import build_worth_chart


@dataclass(frozen=True)
class ReleaseChart:
    """One chart of a release, ready to be drawn in any layout.

    Attributes
    ----------
    name
        Its file name, without ending.
    title, reading, alt_text
        What it shows, how to read it, and what it says, in words and numbers.
    draw
        Builds the bare chart for a layout.
    """

    name: str
    title: str
    reading: str
    alt_text: str
    draw: Callable[[Layout], alt.TopLevelMixin]

    def framed(self, *, frame: Frame, layout: Layout) -> dict[str, Any]:
        """Build the chart's specification, with title, source, caution and alarms around it."""
        return frame_chart(
            self.draw(layout),
            title=self.title,
            reading=self.reading,
            description=self.alt_text,
            frame=frame,
            layout=layout,
        )


def chart_frame(contents: ReleaseContents) -> Frame:
    """Source line, caution and alarms of every chart of a release."""
    return Frame(source=contents.source_line, caution=contents.chart_caution, alarms=contents.alarms)


def build_charts(contents: ReleaseContents) -> tuple[ReleaseChart, ...]:
    """All charts a release has; those about seats only where seats are counted."""
    looks = code_looks(contents.codes)
    charts = [_support_chart(contents, looks), _houses_chart(contents, looks), _worth_chart(contents)]
    alliances = [looks[code.code] for code in contents.codes if code.level is Level.ALLIANCE]
    if _have_history(alliances, contents.tables.support):
        charts.insert(1, _alliances_chart(contents, alliances))
    if contents.tables.seats is not None:
        charts += [
            _seats_chart(contents, looks, contents.tables.seats),
            _seats_over_time_chart(contents, looks, contents.tables.seats),
        ]
    return tuple(charts)


def _support_chart(contents: ReleaseContents, looks: dict[str, CodeLook]) -> ReleaseChart:
    chosen = [looks[code.code] for code in contents.codes if code.level is not Level.ALLIANCE]
    return _support_over_time(
        contents,
        chosen,
        name="support_over_time",
        title="Support over time, and on polling day",
        points="Points: published polls,",
    )


def _have_history(looks: list[CodeLook], support: pd.DataFrame) -> bool:
    """Whether any of the codes existed by the day of the run: one of the future has no past to draw."""
    dated = support[support["kind"] == Kind.ON_DATE]
    return bool(dated["code"].isin([look.code for look in looks]).any())


def _alliances_chart(contents: ReleaseContents, looks: list[CodeLook]) -> ReleaseChart:
    return _support_over_time(
        contents,
        looks,
        name="alliances_over_time",
        title="Support for the alliances over time, and on polling day",
        points="An alliance is the sum of its members. Points: polls that asked for it as one,",
    )


def _support_over_time(
    contents: ReleaseContents, looks: list[CodeLook], *, name: str, title: str, points: str
) -> ReleaseChart:
    support = contents.tables.support
    rows = support[support["region"] == ""]
    content = OverTime(
        rows=rows,
        looks=looks,
        unit="percent of the vote",
        decimals=1,
        run_date=contents.run_date,
        polling_day=contents.contest.last_polling_day,
        points=build_poll_points(contents.inputs, codes=[look.code for look in looks]),
        silence=_silence_everywhere(contents),
    )
    return ReleaseChart(
        name=name,
        title=title,
        reading=f"{CHART_READING} {points} at the middle of their fieldwork, the undecided set aside."
        f"{_silence_reading(contents)}",
        alt_text=_shares_alt_text(title, rows, looks, contents),
        draw=lambda layout: build_over_time_chart(content, layout=layout),
    )


def _silence_everywhere(contents: ReleaseContents) -> list[Silence]:
    """Silence windows of the whole country: a chart of it shows no region's own."""
    return [window for window in contents.contest.release.silence if window.regions is None]


def _silence_reading(contents: ReleaseContents) -> str:
    return " Grey stripe: no publication by law." if _silence_everywhere(contents) else ""


def _shares_alt_text(title: str, rows: pd.DataFrame, looks: list[CodeLook], contents: ReleaseContents) -> str:
    parts = []
    for look in looks:
        now = last_row(rows, code=look.code, kind=Kind.ON_DATE)
        then = last_row(rows, code=look.code, kind=Kind.ON_POLLING_DAY)
        if now is None:
            continue
        part = f"{look.name} {share_text(now['mean'])} ({share_interval_text(now['q05'], now['q95'])})"
        if then is not None:
            interval = share_interval_text(then["q05"], then["q95"])
            part += f", on polling day {share_text(then['mean'])} ({interval})"
        parts.append(part)
    return _with_alarms(
        f"{title}. Mean and 90 % interval on {date_text(contents.run_date)} "
        f"and on {date_text(contents.contest.last_polling_day)}: {'; '.join(parts)}.",
        contents,
    )


def _houses_chart(contents: ReleaseContents, looks: dict[str, CodeLook]) -> ReleaseChart:
    chosen = [looks[code.code] for code in contents.codes if code.level is Level.PARTY]
    houses = contents.tables.houses
    clear = houses[
        houses["code"].isin([c.code for c in chosen]) & ((houses["q05"] > 0) | (houses["q95"] < 0))
    ]
    names = contents.names
    listed = [
        f"{era_name(r['house'], r['method'])}, {names[r['code']]} {points_text(r['lean'])}"
        for r in clear.to_dict("records")
    ]
    title = "Which way each house leans"
    return ReleaseChart(
        name="house_leans",
        title=title,
        reading="Reported share minus what the average of the houses would report, in percentage points. "
        "Shape: estimate; line: 90 % interval; upright line: average of the houses. "
        "A lean is a difference, not an error. Houses in alphabetical order; below a house's name, its way "
        "of working where it has had several.",
        alt_text=_with_alarms(
            f"{title}. {houses['house'].nunique()} houses. 90 % intervals that leave out zero, in points: "
            f"{'; '.join(listed) if listed else 'none'}.",
            contents,
        ),
        draw=lambda layout: build_houses_chart(houses, looks=chosen, layout=layout),
    )


def _worth_chart(contents: ReleaseContents) -> ReleaseChart:
    code = largest_code(contents.tables.support, kind=Kind.ON_DATE)
    rows = contents.tables.shelf_life[contents.tables.shelf_life["code"] == code]
    name = contents.names[code]
    title = f"What a poll of {whole_text(POLL_SIZE)} is still worth, by its age"
    picked = rows[rows["age_days"].isin(WORTH_AGES)]
    listed = [
        f"at {whole_text(r['age_days'])} days {whole_text(r['worth_today'])} "
        f"and {whole_text(r['worth_polling_day'])}"
        for r in picked.to_dict("records")
    ]
    return ReleaseChart(
        name="poll_worth",
        title=title,
        reading=f"For {name}. How many people asked on the day itself would tell as much about support on "
        "that day. Band: 90 % interval.",
        alt_text=_with_alarms(
            f"{title}. For {name}; worth in people asked on the day of the run, and in people asked on "
            f"polling day: {'; '.join(listed)}.",
            contents,
        ),
        draw=lambda layout: build_worth_chart(rows, layout=layout),
    )


def _seats_chart(contents: ReleaseContents, looks: dict[str, CodeLook], seats: pd.DataFrame) -> ReleaseChart:
    chosen = list(looks.values())
    chamber, majority = contents.chamber or 0, contents.majority or 0
    title = f"Seats on polling day, {date_text(contents.contest.last_polling_day)}"
    return ReleaseChart(
        name="seats_on_polling_day",
        title=title,
        reading="Shape: mean; thick line: 50 % interval; thin line: 90 % interval. "
        "Numbers: mean and 90 % interval. An alliance is the sum of its members.",
        alt_text=_seats_alt_text(f"{title}. Majority {majority} of {chamber}", seats, chosen, contents),
        draw=lambda layout: build_seats_chart(
            seats, looks=chosen, chamber=chamber, majority=majority, layout=layout
        ),
    )


def _seats_over_time_chart(
    contents: ReleaseContents, looks: dict[str, CodeLook], seats: pd.DataFrame
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
        line_at=contents.majority,
        line_label=f"majority: {contents.majority}",
        silence=_silence_everywhere(contents),
    )
    return ReleaseChart(
        name="seats_over_time",
        title=title,
        reading=f"{CHART_READING}{_silence_reading(contents)}",
        alt_text=_seats_alt_text(
            f"{title}. Majority {contents.majority} of {contents.chamber}", seats, chosen, contents
        ),
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
    return _with_alarms(f"{opening}. Mean and 90 % interval on polling day: {'; '.join(parts)}.", contents)


def _with_alarms(text: str, contents: ReleaseContents) -> str:
    return " ".join([*(f"{alarm.rstrip('.')}." for alarm in contents.alarms), text])
