"""The poll register of a folder: the rows that are sound, each by itself and all together."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from aggregator.inputs.contest import Contest
from aggregator.inputs.folder_files import missing_file, read_text_or_workbook
from aggregator.inputs.poll_breakdowns import check_breakdowns
from aggregator.inputs.poll_register import read_poll_rows
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.poll_row_checks import check_poll_row
from aggregator.inputs.poll_shares import SharesOfRow, read_shares, rounding_steps
from aggregator.inputs.register_columns import REGISTER_COLUMNS
from aggregator.inputs.register_history import check_history
from aggregator.inputs.table_file import read_table
from aggregator.problems import Problem, Severity


@dataclass(frozen=True)
class Register:
    """The register's rows, each of them sound."""

    file: str
    rows: tuple[PollRow, ...]


def read_register(
    folder: Path, *, contest: Contest | None, read: dict[str, bytes]
) -> tuple[Register | None, list[Problem]]:
    """Read ``polls.csv`` or ``polls.xlsx`` and check every row of it.

    Parameters
    ----------
    contest
        None where it could not be read: then only the shape of the table is checked.
    read
        Bytes by name of the files read so far; takes up this one.

    Returns
    -------
    The rows that nothing is wrong with, None where the table cannot be read, and what was found.
    """
    found, problems = read_text_or_workbook(folder, "polls", what="register", read=read)
    if found is None:
        needed = "the poll register (or polls.xlsx)"
        return None, problems or [missing_file(folder, "polls.csv", needed=needed, read=read)]
    file, data = found
    codes = contest.column_codes if contest is not None else ()
    table, problems = read_table(data, file=file, sheet="polls", columns=(*REGISTER_COLUMNS, *codes))
    if table is None or contest is None:
        return None, problems
    rows, broken, more = read_poll_rows(table, contest=contest)
    problems += more
    sound_rows, broken_polls = [], set(broken)
    for row in rows:
        wrong = check_poll_row(row, file=file, contest=contest)
        problems += wrong
        if wrong:
            broken_polls.add(row.poll)
        else:
            sound_rows.append(row)
    problems += check_history(sound_rows, broken=frozenset(broken_polls), file=file)
    problems += check_breakdowns([row for row in sound_rows if row.poll not in broken_polls], file=file)
    wanted = [row for row in sound_rows if row.wants_in]
    shares, more = read_all_shares(wanted, contest=contest, file=file)
    usable = tuple(row for row in sound_rows if row.row in shares or not row.wants_in)
    return Register(file, usable), problems + [p for p in more if p.severity is Severity.ERROR]


def read_all_shares(
    rows: Sequence[PollRow], *, contest: Contest, file: str
) -> tuple[dict[int, SharesOfRow], list[Problem]]:
    """Read the shares of rows by row number; rows whose figures contradict themselves are left out."""
    steps = rounding_steps(rows)
    shares, problems = {}, []
    for row in rows:
        read, found = read_shares(row, contest=contest, step=steps[row.poll], file=file)
        problems += found
        if read is not None:
            shares[row.row] = read
    return shares, problems
