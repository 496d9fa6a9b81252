"""How every page of the program is made from its template, and how drawn charts go into it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path

from jinja2 import Environment, FileSystemLoader, StrictUndefined
from markupsafe import Markup

from aggregator.release.chart_files import DrawnChart
from aggregator.release.method_note import TEMPLATES
from aggregator.release.rounding import date_text, whole_text


def page_environment(*folders: Path) -> Environment:
    """Set up templates: whatever goes in is escaped, and nothing may be missing.

    Parameters
    ----------
    folders
        Where a page's own templates lie; those of the release, with the parts that pages share, come after.
    """
    environment = Environment(
        loader=FileSystemLoader([*folders, TEMPLATES]),
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        autoescape=True,
        finalize=keep_percent_together,
    )
    environment.filters |= {"day": date_text, "whole": whole_text}
    return environment


def chart_markup(charts: Iterable[DrawnChart]) -> Mapping[str, Mapping[str, object]]:
    """Drawn charts by name, as templates take them: markup for wide and narrow pages, and words."""
    return {
        drawn.chart.name: {
            "wide": Markup(drawn.wide),
            "narrow": Markup(drawn.narrow),
            "name": drawn.chart.name,
            "alt": drawn.chart.alt_text,
        }
        for drawn in charts
    }


def keep_percent_together(value: object) -> object:
    """Keep a number and its percent sign on one line."""
    return (
        value.replace(" %", "\u00a0%") if isinstance(value, str) and not isinstance(value, Markup) else value
    )
