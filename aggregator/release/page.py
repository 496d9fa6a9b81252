"""The release as one page: no script needed, nothing fetched from anywhere."""

from __future__ import annotations

from collections.abc import Sequence

from markdown_it import MarkdownIt
from markupsafe import Markup

from aggregator.problems import Problem
from aggregator.release.assumption_words import assumptions_table, shared_lean_sentences
from aggregator.release.cautions import CAUTIONS
from aggregator.release.chart_files import DrawnChart
from aggregator.release.chart_style import code_looks
from aggregator.release.contents import ReleaseContents
from aggregator.release.lean_page_tables import asked_together_sentences, houses_table, ways_of_asking_table
from aggregator.release.page_tables import (
    chances_table,
    polls_tables,
    regions_table,
    support_table,
    worth_table,
)
from aggregator.release.page_templates import chart_markup, page_environment
from aggregator.release.seats_page_tables import (
    closest_seats_table,
    combinations_table,
    deciding_seats_table,
    districts_table,
    equal_votes_sentences,
    seats_table,
    seats_votes_table,
)

DESK_ONLY_COLUMNS = frozenset({"note", "why_not", "source"})
"""Findings about these columns may quote the desk's own remarks, and stay in the desk's half."""


def build_page(
    contents: ReleaseContents, *, charts: Sequence[DrawnChart], method_note: str, replay: str | None = None
) -> str:
    """Write the page.

    Parameters
    ----------
    contents
        What the release says.
    charts
        Drawn charts, which go in as markup.
    method_note
        The note as Markdown, its foreign text already inert.
    replay
        Link to the contest's replay, relative to the page; None where it has none.
    """
    latest, older = polls_tables(contents)
    return (
        page_environment()
        .get_template("page.html.j2")
        .render(
            contents=contents,
            contest=contents.contest,
            replay=replay,
            cautions=CAUTIONS,
            colours={look.name: look.colour for look in code_looks(contents.codes).values()},
            charts=chart_markup(charts),
            support=support_table(contents),
            regions=regions_table(contents),
            seats=seats_table(contents),
            chances=chances_table(contents),
            combinations=combinations_table(contents),
            deciding=deciding_seats_table(contents),
            closest=closest_seats_table(contents),
            districts=districts_table(contents),
            seats_votes=seats_votes_table(contents),
            equal_votes=equal_votes_sentences(contents),
            houses=houses_table(contents),
            asking=ways_of_asking_table(contents),
            asked_together=asked_together_sentences(contents),
            assumptions=assumptions_table(contents),
            shared_lean=shared_lean_sentences(contents),
            worth=worth_table(contents),
            latest=latest,
            older=older,
            warnings=[
                public_warning(problem)
                for problem in contents.inputs.warnings
                if problem.column not in DESK_ONLY_COLUMNS
            ],
            method=Markup(
                MarkdownIt("commonmark", {"html": False})
                .enable("table")
                .render(_below_page_headings(method_note))
            ),
        )
    )


def public_warning(problem: Problem) -> str:
    """Word a finding for readers of the page: the place and what was found, not what the desk is to do."""
    place = problem.file
    if problem.row is not None:
        place += f", row {problem.row}"
    if problem.column is not None:
        place += f", {problem.column}"
    return f"{place}: found {problem.found}; expected {problem.expected}."


def _below_page_headings(note: str) -> str:
    """Move the note one heading level down and drop its title: the page has its own."""
    lines = [line for line in note.splitlines() if not line.startswith("# ")]
    return "\n".join(f"#{line}" if line.startswith("## ") else line for line in lines)
