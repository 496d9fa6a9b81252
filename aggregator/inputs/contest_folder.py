"""A contest folder, read whole: every file, every finding, one result or one report."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import pandas as pd

from aggregator.errors import InputError
from aggregator.inputs.candidate_checks import check_standing
from aggregator.inputs.candidate_rows import standing_on
from aggregator.inputs.candidates_file import CandidateList, read_candidates_file
from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_checks import check_contest
from aggregator.inputs.contest_file import CONTEST_FILE, read_contest
from aggregator.inputs.counted_result import check_counted_later, counted_as_of
from aggregator.inputs.counting_checks import settle_counting
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.inputs.finding_causes import without_consequences
from aggregator.inputs.fingerprints import Fingerprint, fingerprint
from aggregator.inputs.folder_files import missing_file, read_bytes
from aggregator.inputs.gathered_findings import gather_habits
from aggregator.inputs.label_doubts import check_labels
from aggregator.inputs.past_errors import past_errors_as_of
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.poll_selection import check_span, select_rows
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_doubts import check_doubts
from aggregator.inputs.register_file import Register, read_all_shares, read_register
from aggregator.inputs.register_frames import build_polls, build_unused
from aggregator.inputs.result_files import (
    read_before_last_file,
    read_counted_file,
    read_last_result_file,
    read_record_file,
)
from aggregator.inputs.run_day import RunDay, check_future, choose_run_day
from aggregator.inputs.tracking_windows import (
    check_asked_there_too,
    check_listed_twice,
    check_windows,
    regions_by_poll,
)
from aggregator.inputs.transfers_file import read_transfers_file
from aggregator.inputs.voting_phases import check_phases
from aggregator.problems import Problem, Severity

# Files of a contest that a run does not read yet; a desk that keeps them is told so.
UNREAD_FILES = ("local_judgements.csv",)


@dataclass(frozen=True)
class _Files:
    """What the files hold, and whether every key of the contest could be read."""

    contest: Contest | None
    sound: bool
    register: Register | None
    last_result: pd.DataFrame | None
    counted_result: pd.DataFrame | None
    past_errors: pd.DataFrame | None
    before_last: pd.DataFrame | None
    transfers: pd.DataFrame | None
    candidates: CandidateList | None


def read_contest_folder(folder: Path, *, as_of: date | None = None, today: date) -> DeskInputs:
    """Read and check every file of a contest folder.

    Parameters
    ----------
    folder
        The contest folder.
    as_of
        Read the register as it stood at the end of this day; None for as it stands now.
    today
        The calendar's day.

    Returns
    -------
    DeskInputs
        Everything a run knows.

    Raises
    ------
    InputError
        If anything is wrong: with all findings of all files, warnings included.
    UsageError
        If ``as_of`` lies after polling day.
    MachineError
        If a file is there and the machine cannot read it.
    """
    if not folder.is_dir():
        found = "a file" if folder.exists() else "nothing"
        remedy = "Give the path of a folder; `fieldfold new` makes one."
        raise InputError(
            [Problem(str(folder), None, None, found, "a contest folder", remedy, Rule.FILE_THERE)]
        )
    read: dict[str, bytes] = {}
    files, problems = _read_files(folder, read)
    problems = without_consequences(problems)
    contest, register, last_result = files.contest, files.register, files.last_result
    if contest is None or not files.sound or register is None:
        raise InputError(_in_order(problems, read))
    if _can_settle(contest, last_result, problems):
        contest, more = settle_counting(contest, last_result=last_result)
        problems += more
    if not any(p.rule is Rule.POLLING_DAYS and p.severity is Severity.ERROR for p in problems):
        problems += [p for row in register.rows for p in check_span(row, contest=contest, file=register.file)]
    entering, unused = select_rows(register.rows, contest=contest, as_of=as_of)
    run_day = choose_run_day(register.rows, entering=entering, contest=contest, as_of=as_of, today=today)
    twice = check_listed_twice(_rows_of_polls(register, entering), file=register.file)
    second = {row.poll for row in register.rows if row.row in {p.row for p in twice}}
    once = [row for row in entering if row.poll not in second]
    asked_in = regions_by_poll(register.rows)
    kept, more = check_windows(once, asked_in=asked_in, file=register.file)
    problems += twice + more
    problems += check_future(register.rows, run_day=run_day, file=register.file)
    if not entering and not _errors(problems):
        problems.append(_no_usable_poll(register.file, unused, as_of))
    if _errors(problems):
        raise InputError(_in_order(problems, read))
    # Read again from the rows that enter alone: as of a day, later polls must not show a rounding step.
    shares, more = read_all_shares(entering, contest=contest, file=register.file)
    problems += more
    if _errors(more):
        raise InputError(_in_order(problems, read))
    problems += check_doubts(
        entering, shares=shares, contest=contest, last_result=last_result, file=register.file
    )
    problems += check_labels(entering, contest=contest, file=register.file)
    problems += check_phases(entering, contest=contest, file=register.file)
    problems += check_asked_there_too(entering, asked_in=asked_in, file=register.file)
    if files.candidates is not None:
        problems += check_standing(
            files.candidates.rows,
            contest=contest,
            last_result=last_result,
            polled=_polled(register),
            day=run_day.day,
            live=run_day.live,
            file=files.candidates.file,
        )
    if run_day.live:
        problems += check_counted_later(contest, day=run_day.day)
    out = {row.row for row, _ in unused}
    problems = gather_habits(problems, house_of_row={row.row: row.house for row in register.rows})
    known = contest if as_of is None else contest.known_on(as_of)
    return DeskInputs(
        folder=folder,
        contest=known,
        run_date=run_day.day,
        polls=build_polls(entering, shares=shares, kept=kept, contest=known),
        unused_polls=build_unused(unused, contest=contest),
        last_result=last_result,
        # Doubts about the figures of a row that does not enter are of no use to a reader.
        warnings=_in_order((p for p in problems if _is_about_used(p, register.file, out)), read),
        unpublished=_unpublished(entering, run_day),
        files=tuple(folder / name for name in read),
        fingerprints=tuple(_fingerprints(read)),
        counted_result=counted_as_of(files.counted_result, contest=contest, day=run_day.day),
        past_errors=past_errors_as_of(files.past_errors, day=run_day.day),
        before_last=files.before_last,
        transfers=files.transfers,
        candidates=None if files.candidates is None else standing_on(files.candidates.rows, day=run_day.day),
    )


def _read_files(folder: Path, read: dict[str, bytes]) -> tuple[_Files, list[Problem]]:
    contest, sound, problems = _read_contest(folder, read)
    register, more = read_register(folder, contest=contest, read=read)
    problems += more
    last_result, more = read_last_result_file(folder, contest=contest, read=read)
    problems += more
    counted_result, more = read_counted_file(
        folder, contest=contest, sound=sound, last_result=last_result, read=read
    )
    problems += more
    past_errors, more = read_record_file(folder, contest=contest, read=read)
    problems += more
    before_last, more = read_before_last_file(
        folder, contest=contest, sound=sound, last_result=last_result, read=read
    )
    problems += more
    transfers, more = read_transfers_file(folder, contest=contest, sound=sound, read=read)
    problems += more
    candidates, more = read_candidates_file(
        folder,
        contest=contest,
        sound=sound,
        last_result=last_result,
        polled=_polled(register),
        read=read,
    )
    problems += more + _check_unread(folder, contest)
    return (
        _Files(
            contest, sound, register, last_result, counted_result, past_errors, before_last, transfers,
            candidates,
        ),
        problems,
    )  # fmt: skip


def _polled(register: Register | None) -> frozenset[str]:
    """List the codes for which some row has a figure above 0."""
    rows = register.rows if register is not None else ()
    return frozenset(code for row in rows for code, share in row.shares.items() if share > 0)


def _can_settle(contest: Contest, last_result: pd.DataFrame | None, problems: Iterable[Problem]) -> bool:
    """Tell whether seats can be added up: the last result is there, and the rules have their keys."""
    known = last_result is not None or contest.last_result is None
    return known and not any(p.rule in (Rule.COUNTING_KEYS, Rule.COUNTING_WHERE) for p in problems)


def _errors(problems: Iterable[Problem]) -> bool:
    return any(p.severity is Severity.ERROR for p in problems)


def _in_order(problems: Iterable[Problem], read: dict[str, bytes]) -> tuple[Problem, ...]:
    """Sort by file as read, then row; the order of discovery inside a row."""
    names = list(read)
    place = {name: i for i, name in enumerate(names)}
    return tuple(sorted(problems, key=lambda p: (place.get(p.file, len(names)), p.row or 0)))


def _is_about_used(problem: Problem, register_file: str, out: set[int]) -> bool:
    row_level = problem.file == register_file and problem.row in out
    return not row_level or problem.rule in (Rule.EARLIER_CONTEST, Rule.DATE_ORDER_FOUND, Rule.FILE_ENCODING)


def _read_contest(folder: Path, read: dict[str, bytes]) -> tuple[Contest | None, bool, list[Problem]]:
    """Read the contest; say whether every key of it could be read, and what was found."""
    data = read_bytes(folder, CONTEST_FILE, read=read)
    if data is None:
        return (
            None,
            False,
            [missing_file(folder, CONTEST_FILE, needed="the description of the contest", read=read)],
        )
    contest, problems = read_contest(data)
    if contest is None or problems:
        return contest, False, problems
    return contest, True, check_contest(contest)


def _check_unread(folder: Path, contest: Contest | None) -> list[Problem]:
    used = contest.last_result.file if contest is not None and contest.last_result is not None else ""
    return [
        Problem(
            name, None, None, "a file that no run reads yet", "no such file",
            "It changes nothing; keep it for a later version.", Rule.FILE_UNREAD, Severity.WARNING,
        )
        for name in UNREAD_FILES
        if name != used and (folder / name).is_file()
    ]  # fmt: skip


def _no_usable_poll(file: str, unused: list[tuple[PollRow, str]], as_of: date | None) -> Problem:
    when = f" on {as_of}" if as_of is not None else ""
    first = f"; row {unused[0][0].row}: {unused[0][1]}" if unused else ""
    return Problem(
        file, None, None, f"no poll that can be used{when} ({len(unused)} left out{first})", "one or more",
        "Add a poll, or look at why the others are left out.", Rule.NO_USABLE_POLL,
    )  # fmt: skip


def _rows_of_polls(register: Register, entering: list[PollRow]) -> list[PollRow]:
    """List the rows of polls that enter, also those that another row of their poll stands for."""
    polls = {row.poll for row in entering}
    return [row for row in register.rows if row.poll in polls and row.wants_in]


def _unpublished(entering: list[PollRow], run_day: RunDay) -> tuple[str, ...]:
    if not run_day.live:
        return ()
    return tuple(dict.fromkeys(row.poll for row in entering if row.published > run_day.day))


def _fingerprints(read: dict[str, bytes]) -> Iterable[Fingerprint]:
    return (fingerprint(data, file=name) for name, data in read.items())
