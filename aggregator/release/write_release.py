"""The room's one door: a run's draws in, a release folder out."""

from __future__ import annotations

import shutil
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path

import pandas as pd
import xarray as xr

from aggregator.inputs.contest import CountingRule
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.release.cautions import publication_status
from aggregator.release.chamber import describe_chamber
from aggregator.release.chart_files import write_charts
from aggregator.release.charts import build_charts, chart_frame
from aggregator.release.codes import contest_codes
from aggregator.release.contents import ReleaseContents
from aggregator.release.draws_file import write_draws
from aggregator.release.folder import RELEASES, shelf_of, write_folder
from aggregator.release.headlines import Headlines, build_headlines
from aggregator.release.manifest import (
    build_manifest,
    earlier_runs,
    file_hash,
    inputs_hash,
    name_in_folder,
    write_manifest,
)
from aggregator.release.method_note import build_method_note
from aggregator.release.model_checks import NO_CHECKS, ModelChecks
from aggregator.release.page import build_page
from aggregator.release.predictive_words import predictive_questions
from aggregator.release.replay_link import replay_link
from aggregator.release.run_features import summarise_pace
from aggregator.release.seats_tables import mean_list_seats
from aggregator.release.table_files import round_table, write_table
from aggregator.release.tables import ReleaseTables, build_tables
from aggregator.verdict import Verdict

PUBLIC = "public"
DESK = "desk"
EMBARGOED = "desk/embargoed"
"""Where the public half goes when the run uses a poll that is not yet published."""


@dataclass(frozen=True)
class ReleaseWritten:
    """What was written.

    Attributes
    ----------
    path
        The release folder.
    page
        Its page; in the desk's half where there is no public one.
    headlines
        The opening sentences.
    public
        Whether the release has a public half.
    notices
        What the person running the program must be told: failed checks, no publication.
    """

    path: Path
    page: Path
    headlines: Headlines
    public: bool
    notices: tuple[str, ...]


def write_release(
    inputs: DeskInputs,
    *,
    draws: xr.Dataset,
    seats: xr.Dataset | None,
    shelf_life: pd.DataFrame,
    polls_worth: pd.DataFrame,
    screens: pd.DataFrame,
    verdict: Verdict,
    settings: Mapping[str, object],
    shifted: xr.Dataset | None = None,
    checks: ModelChecks = NO_CHECKS,
    out: Path | None = None,
) -> ReleaseWritten:
    """Write one release, whole or not at all.

    Parameters
    ----------
    inputs
        The desk's checked files.
    draws
        Posterior draws: ``support``, ``national_support`` and their polling-day twins, ``house_lean``,
        ``design_effect`` and the scales; dims (chain, draw, date, region, party, house).
    seats
        Draws of seats; None where there is no last result to count from.
    shelf_life
        Worth of a poll of 1,000 by age and code.
    polls_worth
        One row per poll in the fit: ``poll``, ``worth_today``, and ``pareto_k`` where it was worked out.
    screens
        Questions that polls raise, one row each; they stay in the desk's half.
    verdict
        The judgement on the fit. A release whose checks failed says so in every file a reader may open, and
        lies under ``releases/failed/``.
    settings
        Settings of the run for the note and the manifest, ``seed`` among them.
    shifted
        Polling day counted again with shifted votes, for seats against votes; None where that was not done.
    checks
        Tests of the fit beside its convergence; they inform, and fail nothing.
    out
        Where to put the release instead of ``releases/``; must not hold anything yet.

    Returns
    -------
    ReleaseWritten
        Where it is and what it says.

    Raises
    ------
    UsageError
        If ``out`` already holds something.
    MachineError
        If the release cannot be written.
    SchemaError
        If a table does not hold what its schema says.
    """
    contents = build_contents(
        inputs,
        draws=draws,
        seats=seats,
        shelf_life=shelf_life,
        polls_worth=polls_worth,
        screens=screens,
        verdict=verdict,
        settings=settings,
        shifted=shifted,
        checks=checks,
    )
    reader_half = EMBARGOED if contents.status.unpublished else PUBLIC
    # A release elsewhere may be carried anywhere: it links to nothing outside itself.
    depth = len(shelf_of(inputs.folder, passed=verdict.passed).relative_to(inputs.folder).parts) + 1
    replay = None if out is not None else replay_link(inputs.folder, up=depth + len(Path(reader_half).parts))

    def fill(folder: Path) -> None:
        input_hashes = _copy_inputs(inputs, folder / DESK / "inputs")
        _write_tables(contents, folder)
        write_draws(folder / DESK / "draws.nc", draws=draws, seats=seats)
        _write_warnings(contents, folder / DESK / "warnings.txt")
        _write_reading(contents, folder / PUBLIC, replay=replay)
        if reader_half != PUBLIC:
            (folder / PUBLIC).rename(folder / reader_half)
        earlier = earlier_runs(inputs.folder / RELEASES, fingerprint=inputs_hash(input_hashes))
        write_manifest(
            folder,
            manifest=build_manifest(
                folder,
                inputs=inputs,
                input_hashes=input_hashes,
                verdict=verdict,
                status=contents.status,
                settings=settings,
                headlines=contents.headlines.sentences,
                earlier=earlier,
            ),
        )

    path = write_folder(
        fill, contest_folder=inputs.folder, run_date=inputs.run_date, passed=verdict.passed, out=out
    )
    return ReleaseWritten(
        path=path,
        page=path / reader_half / "index.html",
        headlines=contents.headlines,
        public=reader_half == PUBLIC,
        notices=contents.alarms,
    )


def build_contents(
    inputs: DeskInputs,
    *,
    draws: xr.Dataset,
    seats: xr.Dataset | None,
    shelf_life: pd.DataFrame,
    polls_worth: pd.DataFrame,
    screens: pd.DataFrame,
    verdict: Verdict,
    settings: Mapping[str, object],
    shifted: xr.Dataset | None = None,
    checks: ModelChecks = NO_CHECKS,
) -> ReleaseContents:
    """Work out everything a release says, without writing anything; parameters as for ``write_release``."""
    contest = inputs.contest
    counted = None if contest.counting.rule is CountingRule.NONE or inputs.last_result is None else seats
    tables = _rounded(
        build_tables(
            inputs,
            draws=draws,
            seats=counted,
            shelf_life=shelf_life,
            polls_worth=polls_worth,
            screens=screens,
            shifted=shifted,
            checks=checks,
        )
    )
    chamber = None if counted is None else describe_chamber(counted, contest=contest)
    return ReleaseContents(
        inputs=inputs,
        tables=tables,
        verdict=verdict,
        status=publication_status(contest, run_date=inputs.run_date, unpublished=inputs.unpublished),
        settings=settings,
        headlines=build_headlines(tables, contest=contest, chamber=chamber),
        chamber=chamber,
        list_seats=None if counted is None else mean_list_seats(counted, codes=contest_codes(contest)),
        pace=summarise_pace(draws, prior_sd=_pace_prior(settings)),
    )


def _pace_prior(settings: Mapping[str, object]) -> float | None:
    priors = settings.get("priors")
    return priors.get("ramp_log_sd") if isinstance(priors, Mapping) else None


def _rounded(tables: ReleaseTables) -> ReleaseTables:
    rounded = {
        Path(schema.path).stem: round_table(table, schema=schema) for schema, table in tables.with_schemas()
    }
    return replace(tables, **rounded)


def _copy_inputs(inputs: DeskInputs, folder: Path) -> dict[str, str]:
    """Copy every file that was read; their hashes by name, of the copies."""
    hashes = {}
    for source in inputs.files:
        name = name_in_folder(source, folder=inputs.folder)
        copy = folder / name
        copy.parent.mkdir(parents=True, exist_ok=True)
        shutil.copyfile(source, copy)
        hashes[name] = file_hash(copy)
    return hashes


def _write_tables(contents: ReleaseContents, folder: Path) -> None:
    for schema, table in contents.tables.with_schemas():
        write_table(folder, table=table, schema=schema, caution=contents.caution)


def _write_warnings(contents: ReleaseContents, path: Path) -> None:
    lines = [
        *contents.alarms,
        *(str(problem) for problem in contents.inputs.warnings),
        *predictive_questions(contents.tables.predictive),
    ]
    path.write_text("".join(f"{line}\n" for line in lines), encoding="utf-8")


def _write_reading(contents: ReleaseContents, folder: Path, *, replay: str | None) -> None:
    """Write charts, method note and page."""
    charts = write_charts(folder / "charts", charts=build_charts(contents), frame=chart_frame(contents))
    note = build_method_note(contents)
    (folder / "method.md").write_text(note, encoding="utf-8")
    (folder / "index.html").write_text(
        build_page(contents, charts=charts, method_note=note, replay=replay), encoding="utf-8"
    )
