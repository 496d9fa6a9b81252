"""The room's way out: scores in, a report folder out, whole or not at all."""

from __future__ import annotations

import json
import platform
from collections.abc import Sequence
from pathlib import Path

from aggregator.errors import UsageError
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.release.chart_files import write_charts
from aggregator.release.folder import replace_folder
from aggregator.release.manifest import MANIFEST, file_hash, library_versions, write_manifest
from aggregator.release.replay_link import REPORT_PAGE
from aggregator.release.table_files import write_table
from aggregator.replays.pooling import PooledReplays
from aggregator.replays.replay_charts import build_replay_charts
from aggregator.replays.replay_page import build_replay_page
from aggregator.replays.replay_words import opening_sentences
from aggregator.replays.replayed_fit import ReplayedFit, in_order_of_dates
from aggregator.replays.report_contents import ReportContents, contents_of_pool, contents_of_replay
from aggregator.replays.score_replay import ReplayScores

REPORT = "report"
KIND = "replay report"


def write_replay_report(
    scores: ReplayScores, records: Sequence[ReplayedFit], *, inputs: DeskInputs, out: Path
) -> Path:
    """Write the report of one contest's replay, whole or not at all.

    Parameters
    ----------
    scores
        From ``score_replay``.
    records
        The fits that were scored.
    inputs
        The contest as it stands now.
    out
        The replay's folder. The report goes into ``out/report``, over an earlier report; what else lies in
        ``out``, such as finished fits, stays as it is.

    Returns
    -------
    pathlib.Path
        The page.

    Raises
    ------
    UsageError
        If ``out/report`` is something else than an earlier report.
    MachineError
        If the report cannot be written; an earlier one is then as it was.
    SchemaError
        If a table does not hold what its schema says.
    """
    contents = contents_of_replay(scores, records=records, contest=inputs.contest)
    fits = {fit.key: str(fit.facts.get("as_of")) for fit in in_order_of_dates(records)}
    inputs_read = {print_.file: print_.sha256 for print_ in inputs.fingerprints}
    return _write(contents, out=out, facts={"fits": fits, "inputs": inputs_read})


def write_pooled_report(pooled: PooledReplays, *, out: Path) -> Path:
    """Write the report of several contests' replays taken together, whole or not at all.

    Parameters
    ----------
    pooled
        From ``pool_replays``.
    out
        As for ``write_replay_report``, with the same errors.
    """
    return _write(contents_of_pool(pooled), out=out, facts={})


def _write(contents: ReportContents, *, out: Path, facts: dict[str, object]) -> Path:
    place = out / REPORT
    _check_may_be_replaced(place)

    def fill(folder: Path) -> None:
        for schema, table in contents.with_schemas():
            caution = contents.alarms[0] if contents.alarms else None
            write_table(folder, table=table, schema=schema, caution=caution)
        charts = write_charts(folder / "charts", charts=build_replay_charts(contents), frame=contents.frame)
        page = build_replay_page(contents, charts=charts)
        (folder / "index.html").write_text(page, encoding="utf-8")
        write_manifest(folder, manifest=_manifest(folder, contents=contents, facts=facts))

    replace_folder(fill, place=place, what="replay report")
    return out / REPORT_PAGE


def _check_may_be_replaced(place: Path) -> None:
    if not place.exists() and not place.is_symlink():
        return
    try:
        kind = json.loads((place / MANIFEST).read_text(encoding="utf-8")).get("kind")
    except (OSError, ValueError, AttributeError):
        kind = None
    if kind != KIND or place.is_symlink():
        raise UsageError(
            f"{place} already holds something that is no {KIND}; move it, or name another folder"
        )


def _manifest(folder: Path, *, contents: ReportContents, facts: dict[str, object]) -> dict[str, object]:
    files = sorted(path for path in folder.rglob("*") if path.is_file())
    return {
        "kind": KIND,
        "contests": list(contents.titles),
        "replays": contents.replays,
        "first": contents.days[0].date().isoformat(),
        "last": contents.days[-1].date().isoformat(),
        "headlines": list(opening_sentences(contents)),
        "checks_failed_on": contents.failed_days,
        "for_the_desk_only": True,
        **facts,
        "versions": {"python": platform.python_version(), **library_versions()},
        "outputs": {path.relative_to(folder).as_posix(): file_hash(path) for path in files},
    }
