"""Charts to files: SVG, PNG and Vega-Lite JSON, drawn without any network."""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from dataclasses import dataclass
from html import escape
from pathlib import Path
from typing import Any

import vl_convert

from aggregator.release.chart_style import NARROW, WIDE, Frame, Layout
from aggregator.release.charts import ReleaseChart

NOT_XML = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
"""Characters no XML file may hold (XML 1.0, production 2), such as control characters in a pasted name."""
PNG_SCALE = 2.0
"""Pixels per unit: sharp in print at column width and on dense screens."""


@dataclass(frozen=True)
class DrawnChart:
    """A chart as markup for the page.

    Attributes
    ----------
    chart
        What was drawn.
    wide, narrow
        SVG for a screen and for a phone.
    """

    chart: ReleaseChart
    wide: str
    narrow: str


def write_charts(folder: Path, *, charts: Sequence[ReleaseChart], frame: Frame) -> tuple[DrawnChart, ...]:
    """Write every chart as SVG, PNG and Vega-Lite JSON, and their alt texts as one JSON file.

    Parameters
    ----------
    folder
        Where the files go; made where it does not exist.
    charts
        The charts, bare.
    frame
        Goes around each.

    Returns
    -------
    tuple of DrawnChart
        The same charts as SVG, for the page.
    """
    folder.mkdir(parents=True, exist_ok=True)
    drawn = []
    for chart in charts:
        specification = drawable(chart.framed(frame=frame, layout=WIDE))
        wide = _accessible_svg(vl_convert.vegalite_to_svg(specification), chart, WIDE)
        narrow = _accessible_svg(
            vl_convert.vegalite_to_svg(drawable(chart.framed(frame=frame, layout=NARROW))), chart, NARROW
        )
        (folder / f"{chart.name}.svg").write_text(wide, encoding="utf-8")
        (folder / f"{chart.name}.png").write_bytes(vl_convert.svg_to_png(wide, scale=PNG_SCALE))
        (folder / f"{chart.name}.vl.json").write_text(
            json.dumps(specification, indent=1, ensure_ascii=False) + "\n", encoding="utf-8"
        )
        drawn.append(DrawnChart(chart, wide, narrow))
    texts = {chart.name: {"title": chart.title, "alt": chart.alt_text} for chart in charts}
    (folder / "alt_texts.json").write_text(
        json.dumps(texts, indent=1, ensure_ascii=False) + "\n", encoding="utf-8"
    )
    return tuple(drawn)


def drawable(value: Any) -> Any:
    """Leave out what no XML file may hold, wherever it stands: the renderer would crash on it."""
    if isinstance(value, str):
        return NOT_XML.sub("", value)
    if isinstance(value, list):
        return [drawable(item) for item in value]
    if isinstance(value, dict):
        return {drawable(name): drawable(item) for name, item in value.items()}
    return value


def _accessible_svg(svg: str, chart: ReleaseChart, layout: Layout) -> str:
    """Name and describe the picture for screen readers, and give its parts ids of their own.

    The renderer counts ids on from picture to picture: without names of our own they would clash within one
    page, and differ between two runs.
    """
    ends = "-".join(part for part in (chart.name, layout.name) if part)
    for number, found in enumerate(dict.fromkeys(re.findall(r'\bid="([^"]+)"', svg)), start=1):
        svg = re.sub(
            rf'(\bid="|url\(#|href="#){re.escape(found)}(?=["\)])', rf"\g<1>{ends}-part-{number}", svg
        )
    label = f'role="img" aria-labelledby="{ends}-title {ends}-desc"'
    heading = f'<title id="{ends}-title">{escape(drawable(chart.title))}</title>'
    heading += f'<desc id="{ends}-desc">{escape(drawable(chart.alt_text))}</desc>'
    return re.sub(r"<svg ([^>]*)>", lambda m: f"<svg {m.group(1)} {label}>{heading}", svg, count=1)
