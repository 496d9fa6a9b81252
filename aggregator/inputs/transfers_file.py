"""The file of transfers in a folder, which a contest with run-offs has."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.counting_keys import named_terms
from aggregator.inputs.counting_terms import CountingRule
from aggregator.inputs.folder_files import missing_file, read_text_or_workbook
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import TRANSFER_COLUMNS
from aggregator.inputs.table_file import read_table
from aggregator.inputs.vote_transfers import read_transfers
from aggregator.problems import Problem

_STEM = "transfers"


def read_transfers_file(
    folder: Path, *, contest: Contest | None, sound: bool, read: dict[str, bytes]
) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read ``transfers.csv`` or ``.xlsx``, which a contest has when some region counts in two rounds.

    Parameters
    ----------
    contest
        None where it could not be read: then only the shape of the table is checked.
    sound
        Whether every key of the contest could be read, so that its rules are known.
    read
        Bytes by name of the files read so far; takes up this one.
    """
    found, problems = read_text_or_workbook(folder, _STEM, what="file of transfers", read=read)
    if found is None:
        tables = _tables_with_run_offs(contest) if contest is not None and sound else []
        if tables and not problems:
            needed = f"where voters go in a run-off, which {CountingRule.TWO_ROUND} ({tables[0]}.rule) needs"
            problems = [missing_file(folder, f"{_STEM}.csv", needed=needed, read=read)]
        return None, problems
    file, data = found
    if sound and contest is not None and not _tables_with_run_offs(contest):
        return None, [
            Problem(
                file, None, None, f"the file, while nobody counts in two rounds by {CONTEST_FILE}",
                f'rule = "{CountingRule.TWO_ROUND}" in some region',
                "Correct the rule, or move the file out of the folder.", Rule.FILE_UNREAD,
            )
        ]  # fmt: skip
    table, problems = read_table(data, file=file, sheet=_STEM, columns=TRANSFER_COLUMNS)
    if table is None or contest is None:
        return None, problems
    transfers, more = read_transfers(table, contest=contest)
    return transfers, problems + more


def _tables_with_run_offs(contest: Contest) -> list[str]:
    """Key paths of the tables whose rule has a second round."""
    return [key for key, terms, _ in named_terms(contest) if terms.rule is CountingRule.TWO_ROUND]
