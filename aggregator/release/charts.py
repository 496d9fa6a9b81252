"""The charts of a release, each with its reading help and an alt text that holds the numbers."""

from __future__ import annotations

import pandas as pd

from aggregator.release.chart_style import CHART_READING, CodeLook, Frame, code_looks
from aggregator.release.contents import ReleaseContents
from aggregator.release.headlines import POLL_SIZE
from aggregator.release.interval_charts import build_houses_chart
from aggregator.release.lean_page_tables import era_name
from aggregator.release.over_time_chart import OverTime, build_over_time_chart
from aggregator.release.page_tables import WORTH_AGES
from aggregator.release.poll_points import build_poll_points
from aggregator.release.release_chart import ReleaseChart as ReleaseChart
from aggregator.release.release_chart import silence_everywhere, silence_reading, with_alarms
from aggregator.release.rounding import date_text, points_text, share_interval_text, share_text, whole_text
from aggregator.release.seats_charts import build_seats_charts
from aggregator.release.table_rows import largest_code, last_row
from aggregator.release.table_words import Kind, Level
from aggregator.release.worth_chart import build_worth_chart


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
    return (*charts, *build_seats_charts(contents, looks))


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
        silence=silence_everywhere(contents),
    )
    return ReleaseChart(
        name=name,
        title=title,
        reading=f"{CHART_READING} {points} at the middle of their fieldwork, the undecided set aside."
        f"{silence_reading(contents)}",
        alt_text=_shares_alt_text(title, rows, looks, contents),
        draw=lambda layout: build_over_time_chart(content, layout=layout),
    )


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
    return with_alarms(
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
        alt_text=with_alarms(
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
        alt_text=with_alarms(
            f"{title}. For {name}; worth in people asked on the day of the run, and in people asked on "
            f"polling day: {'; '.join(listed)}.",
            contents,
        ),
        draw=lambda layout: build_worth_chart(rows, layout=layout),
    )
