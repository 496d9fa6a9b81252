"""How every chart looks: sizes, ink, colours with a second cue, the frame with source and caution."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import cycle
from typing import Any

import altair as alt
import pandas as pd

from aggregator.release.codes import Code
from aggregator.release.table_words import Level

INK = "#1c2a30"
MUTED = "#5a6a70"
GRID = "#e6e3da"
PAPER = "#fffdf9"
ALARM = "#9c1c1c"
FONT = "Liberation Sans, Arial, Helvetica, sans-serif"

# Okabe & Ito (2008), Color Universal Design: told apart with every common colour vision. Yellow comes last:
# it is faint on paper.
OKABE_ITO = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000", "#F0E442")
OTHERS_GREY = "#8b9196"
DASH_SHAPE = "M-1,-.35H1V.35H-1Z"
"""A short bar, as a path: others are no party, and look like none."""
CHART_READING = "Line and number: mean; dark band: 50 % interval; light band: 90 % interval."
HEX_COLOUR = re.compile(r"#[0-9A-Fa-f]{6}")
SHAPES = (
    "circle",
    "square",
    "triangle-up",
    "diamond",
    "cross",
    "triangle-down",
    "triangle-right",
    "triangle-left",
)


@dataclass(frozen=True)
class Layout:
    """Size of a chart: for a page or print, or for a phone.

    Attributes
    ----------
    name
        Part of the file name; empty for the wide one.
    width
        Pixels over all.
    font_size, title_size
        Pixels.
    long_names
        Whether names are written out; codes stand in for them where there is no room.
    """

    name: str
    width: int
    font_size: int
    title_size: int
    long_names: bool


WIDE = Layout("", 920, 13, 19, True)
NARROW = Layout("narrow", 350, 11, 15, False)


@dataclass(frozen=True)
class CodeLook:
    """How a code is drawn: its colour, and a shape for those who do not see the colour."""

    code: str
    name: str
    colour: str
    shape: str


def code_looks(codes: Sequence[Code]) -> dict[str, CodeLook]:
    """Give every code a look: the contest's colour where it gives one, else the palette's next."""
    looks: dict[str, CodeLook] = {}
    given = {code.code: code.colour for code in codes if code.colour and HEX_COLOUR.fullmatch(code.colour)}
    taken = {colour.upper() for colour in given.values()}
    palette = cycle([colour for colour in OKABE_ITO if colour not in taken] or OKABE_ITO)
    shapes = {level: cycle(SHAPES) for level in Level}
    for code in codes:
        if code.level is Level.OTHERS:
            colour, shape = given.get(code.code, OTHERS_GREY), DASH_SHAPE
        else:
            colour, shape = given.get(code.code) or next(palette), next(shapes[code.level])
        looks[code.code] = CodeLook(code.code, code.name, colour, shape)
    return looks


def colour_of(looks: Sequence[CodeLook]) -> alt.Color:
    """Colour by code, without a legend: every mark is labelled where it stands."""
    return alt.Color(
        "code:N",
        legend=None,
        scale=alt.Scale(domain=[k.code for k in looks], range=[k.colour for k in looks]),
    )


def shape_of(looks: Sequence[CodeLook]) -> alt.Shape:
    """Shape by code, the second cue."""
    return alt.Shape(
        "code:N", legend=None, scale=alt.Scale(domain=[k.code for k in looks], range=[k.shape for k in looks])
    )


@dataclass(frozen=True)
class Frame:
    """What stands around every chart of one release.

    Attributes
    ----------
    source
        Polls, fieldwork dates, day of the run.
    caution
        The caution inside each chart.
    alarms
        Why the release must not be relied on or published; empty where all is well.
    """

    source: str
    caution: str
    alarms: tuple[str, ...] = ()


def frame_chart(
    chart: alt.TopLevelMixin, *, title: str, reading: str, description: str, frame: Frame, layout: Layout
) -> dict[str, Any]:
    """Put title, reading help, source, caution and alarms around a chart, and its alt text inside.

    The frame is put around the finished specification: nested charts of the library copy one another again
    and again, which made this the slowest step of a release.

    Parameters
    ----------
    chart
        What is to be framed.
    title
        What it shows.
    reading
        How to read it: units, bands, marks.
    description
        The alt text, with the numbers.

    Returns
    -------
    dict
        A Vega-Lite specification.
    """
    size = layout.font_size
    inner, datasets = _bare_specification(chart)
    outer: dict[str, Any] = {"$schema": inner.pop("$schema"), "datasets": datasets}
    inner.pop("config", None)
    notes = [*_wrap(frame.source, layout, size - 1), *_wrap(frame.caution, layout, size - 1)]
    alarms = [line for alarm in frame.alarms for line in _wrap(alarm, layout, size + 1)]
    head = {
        "text": _wrap(title, layout, layout.title_size),
        "subtitle": _wrap(reading, layout, size),
        "anchor": "start",
        "frame": "bounds",
        "fontSize": layout.title_size,
        "fontWeight": 600,
        "color": INK,
        "subtitleFontSize": size,
        "subtitleColor": MUTED,
        "subtitlePadding": 6,
        "offset": 14,
    }
    foot = {
        # A title without text is not drawn at all, subtitle included; a blank line is.
        "text": [""],
        "subtitle": notes,
        "orient": "bottom",
        "anchor": "start",
        "frame": "bounds",
        "subtitleFontSize": size - 1,
        "subtitleColor": MUTED,
        "offset": 0,
    }
    framed: dict[str, Any] = {"title": head, "vconcat": [inner]}
    if alarms:
        alarm = {"text": alarms, "anchor": "start", "frame": "bounds", "fontSize": size + 1, "color": ALARM}
        framed = {"title": alarm | {"fontWeight": 700, "offset": 10}, "vconcat": [framed]}
    return {
        **outer,
        "description": description,
        "background": PAPER,
        "padding": 14,
        "title": foot,
        "vconcat": [framed],
        "config": _config(layout),
    }


@dataclass
class _NamedTables:
    """Tables of one chart, each named and converted once however many layers draw from it."""

    names: dict[int, str] = field(default_factory=dict)
    frames: list[pd.DataFrame] = field(default_factory=list)

    def name_of(self, frame: pd.DataFrame) -> str:
        if id(frame) not in self.names:
            self.frames.append(frame)  # Kept, so that its id is not given to another.
            self.names[id(frame)] = f"table_{len(self.frames)}"
        return self.names[id(frame)]

    def as_rows(self) -> dict[str, Any]:
        return {f"table_{place}": alt.to_values(f)["values"] for place, f in enumerate(self.frames, start=1)}


def _refer_to(data: Any, *, tables: _NamedTables) -> dict[str, str]:
    return {"name": tables.name_of(data)}


alt.data_transformers.register("named_tables", _refer_to)


def _bare_specification(chart: alt.TopLevelMixin) -> tuple[dict[str, Any], dict[str, Any]]:
    """Specification of a chart that names its tables, and their rows.

    Rows inside the layers, as the library puts them there by default, would be copied and hashed once per
    layer: most of the time of a chart.
    """
    tables = _NamedTables()
    with alt.data_transformers.enable("named_tables", tables=tables):
        specification = chart.to_dict(validate=False)
    return specification, tables.as_rows()


def _config(layout: Layout) -> dict[str, Any]:
    size = layout.font_size
    return {
        # One description per picture, not one per mark: a reader would have to step through thousands.
        "aria": False,
        "font": FONT,
        "view": {"stroke": None},
        "axis": {
            "labelColor": MUTED,
            "titleColor": MUTED,
            "labelFontSize": size,
            "titleFontSize": size,
            "titleFontWeight": "normal",
            "gridColor": GRID,
            "domainColor": GRID,
            "tickColor": GRID,
            "labelLimit": 260 if layout.long_names else 130,
        },
    }


def _wrap(text: str, layout: Layout, size: int) -> list[str]:
    """Lines that fit the width: letters of the chart's font are about 0.475 of their height wide."""
    return textwrap.wrap(text, width=int((layout.width - 10) / (0.475 * size))) or [""]
