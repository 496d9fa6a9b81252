"""The outcome, once it is known: what replays of the contest are held against, and no fit ever sees."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import pandas as pd

from aggregator.errors import InputError
from aggregator.inputs.contest import Contest
from aggregator.inputs.fingerprints import Fingerprint, fingerprint
from aggregator.inputs.folder_files import read_text_or_workbook
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import RESULT_COLUMNS
from aggregator.inputs.result_rows import region_of
from aggregator.inputs.sheet_table import SheetTable
from aggregator.inputs.table_file import read_table
from aggregator.inputs.votes_of_today import read_votes_of_today
from aggregator.problems import Problem, Severity

_UNFINISHED = "While votes are still being counted, move the file out of the folder."


@dataclass(frozen=True)
class Outcome:
    """How the election came out.

    Attributes
    ----------
    votes
        Columns as of the last result: ``seat``, ``name``, ``region``, ``seats``, ``cluster``, then votes by
        party code, NaN where the party did not stand; the same seats, or regions, as the last result.
    warnings
        What was doubtful.
    fingerprint
        SHA-256 of the bytes that were read.
    """

    votes: pd.DataFrame
    warnings: tuple[Problem, ...]
    fingerprint: Fingerprint


def read_outcome(
    folder: Path, *, contest: Contest, last_result: pd.DataFrame | None = None
) -> Outcome | None:
    """Read ``result_outcome.csv`` or ``.xlsx``; None where the folder has none.

    Parameters
    ----------
    folder
        The contest folder.
    contest
        The contest, read without findings.
    last_result
        The last result, whose seats the outcome must have too.

    Raises
    ------
    InputError
        If anything is wrong, another party than the contest's among it: with all findings.
    MachineError
        If the file is there and the machine cannot read it.
    """
    read: dict[str, bytes] = {}
    found, problems = read_text_or_workbook(folder, "result_outcome", what="outcome", read=read)
    if found is None:
        if problems:
            raise InputError(problems)
        return None
    file, data = found
    table, problems = read_table(
        data, file=file, sheet="result", columns=(*RESULT_COLUMNS, *contest.party_codes)
    )
    votes = None
    if table is not None:
        votes, more = read_votes_of_today(
            table, contest=contest, last_result=last_result, unfinished=_UNFINISHED
        )
        problems += [*more, *_check_regions(table, contest)]
    if votes is None or any(p.severity is Severity.ERROR for p in problems):
        raise InputError(problems)
    return Outcome(votes, tuple(problems), fingerprint(data, file=file))


def _check_regions(table: SheetTable, contest: Contest) -> Iterator[Problem]:
    """Check that no region is missing; without a column of regions that is said already."""
    if not table.rows or (len(contest.regions) > 1 and "region" not in table.columns):
        return
    met = {region_of(row, contest=contest) for row in table.rows}
    for i, region in enumerate(contest.regions, start=1):
        if region.code not in met:
            yield Problem(
                table.file, None, "region", f"no row for {region.code} (region[{i}] of contest.toml)",
                "votes in every region", f"Add its rows. {_UNFINISHED}", Rule.REGION_WITHOUT_RESULT,
            )  # fmt: skip
