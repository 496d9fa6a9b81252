"""The list of candidates in a folder, where the desk has one."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

import pandas as pd

from aggregator.inputs.candidate_checks import check_candidates
from aggregator.inputs.candidate_rows import CandidateRow, read_candidate_rows
from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.counting_terms import CountingRule
from aggregator.inputs.folder_files import read_text_or_workbook
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import CANDIDATE_COLUMNS
from aggregator.inputs.table_file import read_table
from aggregator.problems import Problem

_STEM = "candidates"


@dataclass(frozen=True)
class CandidateList:
    """The rows of the list, withdrawn candidates among them."""

    file: str
    rows: tuple[CandidateRow, ...]


def read_candidates_file(
    folder: Path,
    *,
    contest: Contest | None,
    sound: bool,
    last_result: pd.DataFrame | None,
    polled: frozenset[str],
    read: dict[str, bytes],
) -> tuple[CandidateList | None, list[Problem]]:
    """Read ``candidates.csv`` or ``.xlsx``, where the desk has one.

    Parameters
    ----------
    contest
        None where it could not be read: then only the shape of the table is checked.
    sound
        Whether every key of the contest could be read, so that its rules are known.
    last_result
        The last result, whose seats the candidates stand in; None where it could not be read.
    polled
        Parties for which some poll has a figure above 0.
    read
        Bytes by name of the files read so far; takes up this one.

    Returns
    -------
    The list, None without one, and what was found.
    """
    found, problems = read_text_or_workbook(folder, _STEM, what="list of candidates", read=read)
    if found is None:
        return None, problems
    file, data = found
    if sound and contest is not None and not _elects_in_rows(contest):
        return None, [
            Problem(
                file, None, None, f"the file, while by {CONTEST_FILE} no seat or district elects anybody",
                "a rule that elects by seat or district in some region",
                "Correct the rule, or move the file out of the folder.", Rule.FILE_UNREAD,
            )
        ]  # fmt: skip
    table, problems = read_table(data, file=file, sheet=_STEM, columns=CANDIDATE_COLUMNS)
    problems = [_without_names(problem) for problem in problems]
    if table is None or contest is None:
        return None, problems
    rows, more = read_candidate_rows(table)
    problems += more
    problems += check_candidates(rows, contest=contest, last_result=last_result, polled=polled, file=file)
    return CandidateList(file, rows), problems


def _without_names(problem: Problem) -> Problem:
    """Word a finding so that it shows no word of the file: findings are published, names are not."""
    if problem.rule != Rule.FILE_ENCODING:
        return problem
    return replace(
        problem,
        found="text that is not UTF-8; read as Windows-1252",
        remedy="Check that its letters with accents are right, and save the file as CSV UTF-8.",
    )


def _elects_in_rows(contest: Contest) -> bool:
    """Whether somebody is elected in a row of the last result."""
    return any(
        terms.rule is not CountingRule.NONE and terms.elects_by_row for terms, _ in contest.counting_groups
    )
