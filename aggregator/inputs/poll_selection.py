"""Which rows enter the fit, and the reason for each one that does not."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date

from aggregator.inputs.contest import Contest
from aggregator.inputs.poll_breakdowns import choose_rows
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import Question, Use
from aggregator.inputs.register_history import register_as_of
from aggregator.problems import Problem, Severity


def select_rows(
    rows: Sequence[PollRow], *, contest: Contest, as_of: date | None
) -> tuple[list[PollRow], list[tuple[PollRow, str]]]:
    """Divide the register into rows that enter and rows that do not, each with its reason."""
    standing, out = register_as_of(rows, as_of=as_of)
    wanted = []
    for row in standing:
        reason = _why_not(row, contest)
        if reason:
            out.append((row, reason))
        else:
            wanted.append(row)
    entering, replaced = choose_rows(wanted, contest=contest)
    return entering, sorted(out + replaced, key=lambda o: o[0].row)


def polling_day_of(row: PollRow, contest: Contest) -> date:
    """Give the last polling day among a row's regions."""
    return max((contest.polling_day_of(r) for r in row.regions), default=contest.polling_day)


def _why_not(row: PollRow, contest: Contest) -> str:
    if row.use is Use.NO:
        return row.why_not
    if row.question is not Question.VOTE:
        return f"question: {row.question}"
    polling_day = polling_day_of(row, contest)
    if row.end >= polling_day and row.use is not Use.YES:
        return f"fieldwork ended on or after polling day ({polling_day})"
    if contest.last_result is not None and row.end <= contest.last_result.date:
        return f"fieldwork ended before the last election was over ({contest.last_result.date})"
    return ""


def check_span(row: PollRow, *, contest: Contest, file: str) -> list[Problem]:
    """Look for doubtful fieldwork at either end of the contest."""
    if not row.wants_in:
        return []
    problems = []
    last, polling_day = contest.last_result, polling_day_of(row, contest)
    if last is not None and row.end <= last.date:
        problems.append(
            Problem(
                file, row.row, "end", row.end.isoformat(), f"a day after the last election ({last.date})",
                "It is left out; check the year.", Rule.EARLIER_CONTEST, Severity.WARNING,
            )
        )  # fmt: skip
    elif last is not None and row.start <= last.date:
        problems.append(
            Problem(
                file, row.row, "start", row.start.isoformat(),
                f"a day after the last election ({last.date})", "Correct the date: interviews from "
                "before and after an election are not one poll.", Rule.EARLIER_CONTEST,
            )
        )  # fmt: skip
    if row.use is Use.YES and row.end > contest.last_polling_day:
        problems.append(
            Problem(
                file, row.row, "use", f"yes for fieldwork that ended on {row.end}",
                f"fieldwork that ended by polling day ({contest.last_polling_day})",
                "Correct the date, or set use = no and say why.", Rule.USED_ON_POLLING_DAY,
            )
        )  # fmt: skip
    elif row.use is Use.YES and row.end >= polling_day:
        late = row.end > polling_day
        when, what = (f"on {row.end}, after", ", as of polling day") if late else ("on", "")
        problems.append(
            Problem(
                file, row.row, "use", f"yes for fieldwork that ended {when} polling day ({polling_day})",
                "fieldwork that ended before", f"It enters as the desk says so{what}.",
                Rule.USED_ON_POLLING_DAY, Severity.WARNING,
            )
        )  # fmt: skip
    return problems
