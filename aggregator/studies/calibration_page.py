"""The page of a calibration: what was studied, what was found, how to do it again."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from aggregator.refits.pace import measure_costs, words_for
from aggregator.release.chart_files import DrawnChart
from aggregator.release.page_templates import chart_markup, page_environment
from aggregator.studies.calibration_report import FEWEST_ELECTIONS, CalibrationReport
from aggregator.studies.calibration_tables import page_tables

PAGE = "index.html"
TEMPLATES = Path(__file__).parent / "templates"
CAUTION = (
    "Invented elections follow the model's own assumptions, with every number drawn anew. They show whether "
    "stated uncertainty is right if those assumptions hold; real elections may break them."
)
MANY_ELECTIONS = 200


def build_page(report: CalibrationReport, *, charts: Sequence[DrawnChart]) -> str:
    """Write the page."""
    return (
        page_environment(TEMPLATES)
        .get_template("calibration.html.j2")
        .render(
            title=title_of(report),
            headlines=headlines(report),
            caution=CAUTION,
            tables=page_tables(report),
            charts=chart_markup(charts),
            colours={},
            facts=facts_of_study(report),
        )
    )


def title_of(report: CalibrationReport) -> str:
    """Name the study."""
    violation = report.plan.violation
    told = "as the model assumes them" if violation is None else f"with {violation.name.replace('_', ' ')}"
    return f"{report.plan.elections} invented elections {told}"


def headlines(report: CalibrationReport) -> tuple[str, ...]:
    """Say what was found, in sentences."""
    sentences = [report.plan.violation.what] if report.plan.violation is not None else []
    if report.verdict is not None:
        sentences.append(report.verdict.text)
    support = report.coverage[report.coverage["group"] == "all support"].set_index("stated")
    for percent in (90, 50):
        row = support.loc[percent]
        sure = "" if row["elections"] < 2 else f" ({row['low']:.1f} to {row['high']:.1f})"
        sentences.append(
            f"Of {row['intervals']:,.0f} intervals of {percent} % for support, {row['inside']:.1f} % hold "
            f"the truth{sure}."
        )
    if report.damage is not None:
        row = report.damage.set_index("group").loc["all support"]
        sentences.append(
            f"Without that, {row['inside_honest']:.1f} % of the 90 % intervals hold the truth. With it the "
            f"CRPS of support is {row['crps_ratio']:.2f} times as large."
        )
    if report.verdict is None and report.plan.violation is None:
        sentences.append(f"Too few elections for a verdict: it takes {FEWEST_ELECTIONS}.")
    return tuple(sentences)


def facts_of_study(report: CalibrationReport) -> tuple[tuple[str, str], ...]:
    """Everything needed to do it again, and what it cost."""
    plan, fits = report.plan, report.study.fits
    settings = plan.settings
    low, high = report.errors.band
    return (
        ("Elections", f"{plan.elections}, seeds {plan.seeds.start} to {plan.seeds.stop - 1}"),
        ("Size", plan.size_text),
        ("Each fit", f"{settings.chains} chains of {settings.tune} + {settings.draws} draws"),
        ("Fits whose checks failed", f"{int((~fits['passed']).sum())} of {len(fits)}"),
        (
            "Whitened errors of the country",
            f"sum of squares {report.errors.chi_square:.1f} on {report.errors.degrees} degrees of freedom; "
            f"a right method leaves {low:.1f} to {high:.1f} once in a hundred studies",
        ),
        ("Cost", cost_text(report)),
    )


def cost_text(report: CalibrationReport) -> str:
    """Seconds of a fit, and what 200 such fits take."""
    costs = measure_costs(report.study.facts)
    one, two = (words_for(costs.seconds_for(MANY_ELECTIONS, workers=workers)) for workers in (1, 2))
    return (
        f"{costs.next_seconds:.1f} s a fit ({costs.first_seconds:.1f} s where it compiles); "
        f"{MANY_ELECTIONS} fits: about {one} on one worker, {two} on two"
    )
