"""The replay report as one page: no script needed, nothing fetched from anywhere."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from aggregator.release.chart_files import DrawnChart
from aggregator.release.page_templates import chart_markup, page_environment
from aggregator.replays.methods import EVERY_LEAD, Quantity, Where
from aggregator.replays.replay_cautions import REPLAY_CAUTIONS
from aggregator.replays.replay_page_tables import (
    by_size_table,
    comparison_table,
    coverage_table,
    error_table,
    last_day_tables,
    seat_score_table,
    staleness_table,
)
from aggregator.replays.replay_schemas import REPLAY_SCHEMAS
from aggregator.replays.replay_words import (
    COMPARED,
    opening_sentences,
    rival_sentences,
    staleness_sentence,
    unit_sentence,
)
from aggregator.replays.report_contents import ReportContents

TEMPLATES = Path(__file__).parent / "templates"


def build_replay_page(contents: ReportContents, *, charts: Sequence[DrawnChart]) -> str:
    """Write the page.

    Parameters
    ----------
    contents
        What the report says.
    charts
        Drawn charts, which go in as markup.
    """
    tables = [comparison_table(contents, quantity=quantity, where=where) for quantity, where in COMPARED]
    return (
        page_environment(TEMPLATES)
        .get_template("replay.html.j2")
        .render(
            contents=contents,
            cautions=REPLAY_CAUTIONS,
            charts=chart_markup(charts),
            colours={look.name: look.colour for look in contents.looks},
            opening=opening_sentences(contents),
            last_day=last_day_tables(contents),
            support_errors=error_table(contents, quantity=Quantity.SUPPORT, where=Where.COUNTRY),
            rivals=rival_sentences(contents),
            unit=unit_sentence(contents),
            comparisons=[table for table in tables if table is not None],
            coverage=coverage_table(contents),
            by_size=by_size_table(contents),
            seat_scores=seat_score_table(contents),
            staleness=staleness_table(contents),
            staleness_words=staleness_sentence(contents),
            every_lead=EVERY_LEAD.label,
            files=[schema.path for schema in REPLAY_SCHEMAS if schema.path in _written(contents)],
        )
    )


def _written(contents: ReportContents) -> set[str]:
    return {schema.path for schema, _ in contents.with_schemas()}
