"""The files of results in a folder: of the last elections, counts of today, the record of polls' errors."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from aggregator.inputs.before_last_result import read_before_last_result
from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.counted_result import check_counted_regions, read_counted_result
from aggregator.inputs.folder_files import missing_file, read_bytes, read_text_or_workbook
from aggregator.inputs.last_result import read_last_result
from aggregator.inputs.past_errors import read_past_errors
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import RECORD_COLUMNS, RESULT_COLUMNS
from aggregator.inputs.table_file import read_table
from aggregator.problems import Problem

DEFAULT_RESULT_FILE = "result_last.csv"
BEFORE_LAST = "result_before_last"

type _Found = tuple[pd.DataFrame | None, list[Problem]]


def read_last_result_file(folder: Path, *, contest: Contest | None, read: dict[str, bytes]) -> _Found:
    """Read the last result that the contest names.

    Parameters
    ----------
    contest
        None where it could not be read: then only the shape of the table is checked.
    read
        Bytes by name of the files read so far; takes up this one.
    """
    named = contest.last_result if contest is not None else None
    file = named.file if named is not None else DEFAULT_RESULT_FILE
    data = read_bytes(folder, file, read=read)
    if data is None:
        needed = f"the last result, which {CONTEST_FILE} names"
        return None, [missing_file(folder, file, needed=needed, read=read)] if named is not None else []
    if contest is not None and named is None:
        found = Problem(
            file, None, None, f"the file, while {CONTEST_FILE} has no [last_result]",
            "[last_result] with the date of the election",
            "Add it, or move the file out of the folder.", Rule.FILE_UNREAD,
        )  # fmt: skip
        return None, [found]
    codes = contest.party_codes if contest is not None else ()
    table, problems = read_table(data, file=file, sheet="result", columns=(*RESULT_COLUMNS, *codes))
    if table is None or contest is None:
        return None, problems
    last_result, more = read_last_result(table, contest=contest)
    return last_result, problems + more


def read_counted_file(
    folder: Path,
    *,
    contest: Contest | None,
    sound: bool,
    last_result: pd.DataFrame | None,
    read: dict[str, bytes],
) -> _Found:
    """Read ``result_counted.csv`` or ``.xlsx``, which a contest has when some region has been counted.

    Parameters
    ----------
    sound
        Whether every key of the contest could be read, so that it is known which regions are counted.
    """
    found, problems = read_text_or_workbook(folder, "result_counted", what="file of counts", read=read)
    counted = [r.code for r in contest.regions if r.counted is not None] if contest is not None else []
    if found is None:
        if counted and not problems:
            needed = f"the votes of {', '.join(counted)}, which {CONTEST_FILE} calls counted"
            problems = [missing_file(folder, "result_counted.csv", needed=needed, read=read)]
        return None, problems
    file, data = found
    if sound and not counted:
        return None, [
            Problem(
                file, None, None, f"the file, while no region of {CONTEST_FILE} is counted",
                "a region with counted", "Add counted = the day the region's count was published, or move "
                "the file out of the folder.", Rule.FILE_UNREAD,
            )
        ]  # fmt: skip
    codes = contest.party_codes if contest is not None else ()
    table, problems = read_table(data, file=file, sheet="result", columns=(*RESULT_COLUMNS, *codes))
    if table is None or contest is None:
        return None, problems
    result, more = read_counted_result(table, contest=contest, last_result=last_result)
    problems += more
    if sound and table.rows and (len(contest.regions) < 2 or "region" in table.columns):
        problems += check_counted_regions(table, contest=contest)
    return result, problems


def read_before_last_file(
    folder: Path,
    *,
    contest: Contest | None,
    sound: bool,
    last_result: pd.DataFrame | None,
    read: dict[str, bytes],
) -> _Found:
    """Read ``result_before_last.csv`` or ``.xlsx``, the result before the last, where the desk has one."""
    found, problems = read_text_or_workbook(folder, BEFORE_LAST, what="result before the last", read=read)
    if found is None:
        return None, problems
    file, data = found
    if sound and contest is not None and contest.last_result is None:
        return None, [
            Problem(
                file, None, None, f"the file, while {CONTEST_FILE} has no [last_result]",
                "[last_result] with the date of the election",
                "Add it, or move the file out of the folder.", Rule.FILE_UNREAD,
            )
        ]  # fmt: skip
    codes = contest.party_codes if contest is not None else ()
    table, problems = read_table(data, file=file, sheet="result", columns=(*RESULT_COLUMNS, *codes))
    if table is None or contest is None:
        return None, problems
    result, more = read_before_last_result(table, contest=contest, last_result=last_result)
    return result, problems + more


def read_record_file(folder: Path, *, contest: Contest | None, read: dict[str, bytes]) -> _Found:
    """Read ``past_errors.csv`` or ``.xlsx``, the desk's record of earlier elections, where it has one."""
    found, problems = read_text_or_workbook(folder, "past_errors", what="record", read=read)
    if found is None:
        return None, problems
    file, data = found
    table, problems = read_table(data, file=file, sheet="past_errors", columns=RECORD_COLUMNS)
    if table is None or contest is None:
        return None, problems
    record, more = read_past_errors(table, contest=contest)
    return record, problems + more
