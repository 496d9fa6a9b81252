"""The method note: the model in words, this run's settings, checks, polls and cautions."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator, Mapping
from html import escape
from pathlib import Path

from jinja2 import Environment, FileSystemLoader, StrictUndefined

from aggregator.release.assumption_words import assumptions_table, shared_lean_sentences
from aggregator.release.cautions import CAUTIONS
from aggregator.release.contents import ReleaseContents
from aggregator.release.counting_words import describe_counting
from aggregator.release.grounds_words import describe_grounds
from aggregator.release.predictive_words import predictive_sentences
from aggregator.release.prior_words import describe_priors
from aggregator.release.rounding import date_text, whole_text
from aggregator.release.run_features import describe_features

TEMPLATES = Path(__file__).parent / "templates"


def build_method_note(contents: ReleaseContents) -> str:
    """Write the note as Markdown; every number in it is of this run.

    Text of the desk's own files is escaped, so that it stays text wherever the note is shown.
    """
    environment = Environment(
        loader=FileSystemLoader(TEMPLATES),
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        autoescape=False,
    )
    environment.filters |= {
        "md": inert_markdown,
        "day": date_text,
        "whole": whole_text,
        "brief": brief_number,
        "one_line": cell_in_one_line,
    }
    unused = contents.inputs.unused_polls
    settings = dict(contents.settings)
    priors = settings.pop("priors", None)
    reasons = Counter(reason_without_days(reason) for reason in unused["why_not"].astype(str))
    return environment.get_template("method.md.j2").render(
        contents=contents,
        contest=contents.contest,
        model=contents.contest.model,
        cautions=CAUTIONS,
        anchored=contents.inputs.last_result is not None,
        checks=list(contents.verdict.table.itertuples()),
        settings=list(flat_settings(settings)),
        priors=describe_priors(priors) if isinstance(priors, Mapping) else [],
        unused_reasons=reasons,
        unused_count=len(unused),
        features=describe_features(contents),
        counting=describe_counting(contents),
        shared_lean=shared_lean_sentences(contents),
        assumptions=assumptions_table(contents),
        predictive=predictive_sentences(contents.tables.predictive),
        grounds=describe_grounds(contents),
    )


def reason_without_days(reason: str) -> str:
    """Drop the days from a reason, so that one reason on many days is one line of the note."""
    return re.sub(r"\d{4}-\d{2}-\d{2}", "…", reason).rstrip(".")


def inert_markdown(text: object) -> str:
    """Text that Markdown shows as it is: no markup, no table cell, no new line, no tag."""
    flat = " ".join(escape(str(text), quote=False).split())
    for mark in "\\`*_[]|#":
        flat = flat.replace(mark, f"\\{mark}")
    return flat


def cell_in_one_line(cell: str) -> str:
    """Put the second line of a page table's cell behind its first, in brackets."""
    first, _, second = cell.partition("\n")
    return f"{first} ({second})" if second else first


def brief_number(value: object) -> str:
    """Write a number with four figures that count, anything else as inert text."""
    return f"{value:.4g}" if isinstance(value, float) else inert_markdown(value)


def flat_settings(settings: Mapping[str, object], *, prefix: str = "") -> Iterator[tuple[str, str]]:
    """List settings as name and value, a nested one named ``outer.inner``."""
    for name, value in settings.items():
        if isinstance(value, Mapping):
            yield from flat_settings(value, prefix=f"{prefix}{name}.")
        else:
            yield f"{prefix}{name}", "–" if value is None else brief_number(value)
