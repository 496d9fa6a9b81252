"""A contest folder, read whole: every file, every finding, one result or one report."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import pandas as pd

from aggregator.errors import InputError, MachineError
from aggregator.inputs.close_spelling import close_spelling
from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_checks import check_contest
from aggregator.inputs.contest_file import CONTEST_FILE, read_contest
from aggregator.inputs.counting_checks import settle_counting
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.inputs.finding_causes import without_consequences
from aggregator.inputs.fingerprints import Fingerprint, fingerprint
from aggregator.inputs.gathered_findings import gather_habits
from aggregator.inputs.last_result import read_last_result
from aggregator.inputs.poll_breakdowns import check_breakdowns
from aggregator.inputs.poll_register import read_poll_rows
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.poll_row_checks import check_poll_row
from aggregator.inputs.poll_selection import check_span, select_rows
from aggregator.inputs.poll_shares import SharesOfRow, read_shares, rounding_steps
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import REGISTER_COLUMNS, RESULT_COLUMNS
from aggregator.inputs.register_doubts import check_doubts
from aggregator.inputs.register_frames import build_polls, build_unused
from aggregator.inputs.register_history import check_history
from aggregator.inputs.run_day import RunDay, check_future, choose_run_day
from aggregator.inputs.table_file import read_table
from aggregator.inputs.tracking_windows import check_windows
from aggregator.problems import Problem, Severity

REGISTER_FILES = ("polls.csv", "polls.xlsx")
DEFAULT_RESULT_FILE = "result_last.csv"

# Files of a contest that a run does not read yet; a desk that keeps them is told so.
UNREAD_FILES = (
    "candidates.csv",
    "local_judgements.csv",
    "result_before_last.csv",
    "past_errors.csv",
)


@dataclass(frozen=True)
class _Register:
    """The register's rows, each of them sound."""

    file: str
    rows: tuple[PollRow, ...]


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
    contest, sound, problems = _read_contest(folder, read)
    register, more = _read_register(folder, read, contest)
    problems += more
    last_result, more = _read_result(folder, read, contest)
    problems += more + _check_unread(folder, contest)
    problems = without_consequences(problems)
    if contest is None or not sound or register is None:
        raise InputError(_in_order(problems, read))
    if last_result is not None or contest.last_result is None:
        contest, more = settle_counting(contest, last_result=last_result)
        problems += more
    if not any(p.rule is Rule.POLLING_DAYS and p.severity is Severity.ERROR for p in problems):
        problems += [p for row in register.rows for p in check_span(row, contest=contest, file=register.file)]
    entering, unused = select_rows(register.rows, contest=contest, as_of=as_of)
    run_day = choose_run_day(register.rows, entering=entering, contest=contest, as_of=as_of, today=today)
    kept, more = check_windows(entering, file=register.file)
    problems += more
    problems += check_future(register.rows, run_day=run_day, file=register.file)
    if not entering and not _errors(problems):
        problems.append(_no_usable_poll(register.file, unused, as_of))
    if _errors(problems):
        raise InputError(_in_order(problems, read))
    # Read again from the rows that enter alone: as of a day, later polls must not show a rounding step.
    shares, more = _read_all_shares(entering, contest=contest, file=register.file)
    problems += more
    if _errors(more):
        raise InputError(_in_order(problems, read))
    problems += check_doubts(
        entering, shares=shares, contest=contest, last_result=last_result, file=register.file
    )
    out = {row.row for row, _ in unused}
    problems = gather_habits(problems, house_of_row={row.row: row.house for row in register.rows})
    polls = build_polls(entering, shares=shares, kept=kept, contest=contest)
    return DeskInputs(
        folder=folder,
        contest=contest,
        run_date=run_day.day,
        polls=polls,
        unused_polls=build_unused(unused, contest=contest),
        last_result=last_result,
        # Doubts about the figures of a row that does not enter are of no use to a reader.
        warnings=_in_order((p for p in problems if _is_about_used(p, register.file, out)), read),
        unpublished=_unpublished(entering, run_day),
        files=tuple(folder / name for name in read),
        fingerprints=tuple(_fingerprints(read)),
    )


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


def _read_bytes(folder: Path, name: str, read: dict[str, bytes]) -> bytes | None:
    """Read the bytes of a file, None where it is not there; remembered under its name."""
    path = folder / name
    try:
        data = path.read_bytes()
    except FileNotFoundError:
        return None
    except OSError as error:
        raise MachineError(f"{path} cannot be read: {error.strerror or error}.") from error
    read[name] = data
    return data


def _missing(folder: Path, name: str, needed: str) -> Problem:
    near = close_spelling(name, (p.name for p in folder.iterdir() if p.is_file()))
    remedy = f'If "{near}" is meant, save it as {name}; else add the file.' if near else "Add the file."
    return Problem(name, None, None, "no such file", needed, remedy, Rule.FILE_THERE)


def _read_contest(folder: Path, read: dict[str, bytes]) -> tuple[Contest | None, bool, list[Problem]]:
    """Read the contest; say whether every key of it could be read, and what was found."""
    data = _read_bytes(folder, CONTEST_FILE, read)
    if data is None:
        return None, False, [_missing(folder, CONTEST_FILE, "the description of the contest")]
    contest, problems = read_contest(data)
    if contest is None or problems:
        return contest, False, problems
    return contest, True, check_contest(contest)


def _read_register(
    folder: Path, read: dict[str, bytes], contest: Contest | None
) -> tuple[_Register | None, list[Problem]]:
    there = {name: data for name in REGISTER_FILES if (data := _read_bytes(folder, name, read)) is not None}
    if not there:
        return None, [_missing(folder, REGISTER_FILES[0], "the poll register (or polls.xlsx)")]
    file, data = next(iter(there.items()))
    if len(there) > 1:
        found = Problem(
            REGISTER_FILES[1], None, None, f"a second register beside {file}", "one register",
            "Move one of the two out of the folder.", Rule.FILE_THERE,
        )  # fmt: skip
        return None, [found]
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
    shares, more = _read_all_shares(wanted, contest=contest, file=file)
    usable = tuple(row for row in sound_rows if row.row in shares or not row.wants_in)
    return _Register(file, usable), problems + [p for p in more if p.severity is Severity.ERROR]


def _read_all_shares(
    rows: list[PollRow], *, contest: Contest, file: str
) -> tuple[dict[int, SharesOfRow], list[Problem]]:
    steps = rounding_steps(rows)
    shares, problems = {}, []
    for row in rows:
        read, found = read_shares(row, contest=contest, step=steps[row.poll], file=file)
        problems += found
        if read is not None:
            shares[row.row] = read
    return shares, problems


def _read_result(
    folder: Path, read: dict[str, bytes], contest: Contest | None
) -> tuple[pd.DataFrame | None, list[Problem]]:
    named = contest.last_result if contest is not None else None
    file = named.file if named is not None else DEFAULT_RESULT_FILE
    data = _read_bytes(folder, file, read)
    if data is None:
        needed = f"the last result, which {CONTEST_FILE} names"
        return None, [_missing(folder, file, needed)] if named is not None else []
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
    last_result, found_more = read_last_result(table, contest=contest)
    return last_result, problems + found_more


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


def _unpublished(entering: list[PollRow], run_day: RunDay) -> tuple[str, ...]:
    if not run_day.live:
        return ()
    return tuple(dict.fromkeys(row.poll for row in entering if row.published > run_day.day))


def _fingerprints(read: dict[str, bytes]) -> Iterable[Fingerprint]:
    return (fingerprint(data, file=name) for name, data in read.items())
