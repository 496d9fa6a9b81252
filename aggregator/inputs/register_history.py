"""The register as it stood on a day: corrections, withdrawals, what was not yet published."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from datetime import date

from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import Status
from aggregator.problems import Problem


def register_as_of(
    rows: Sequence[PollRow], *, as_of: date | None
) -> tuple[list[PollRow], list[tuple[PollRow, str]]]:
    """Divide the rows into those that stood on a day and those that did not, with the reason.

    Parameters
    ----------
    as_of
        The day; None for the register as it stands now, with every correction and withdrawal in force.
    """
    corrected_by = {
        row.replaces: row for row in rows if row.replaces and (as_of is None or _in_force(row, as_of))
    }
    standing, out = [], []
    for row in rows:
        correction = corrected_by.get(row.poll)
        if as_of is not None and row.published > as_of:
            out.append((row, f"published on {row.published}, after {as_of}"))
        elif as_of is not None and row.replaces and not _in_force(row, as_of):
            out.append((row, f"corrects {row.replaces} from {row.status_date} on, after {as_of}"))
        elif correction is not None:
            out.append((row, f"corrected by {correction.poll} from {correction.status_date} on"))
        elif row.status is Status.WITHDRAWN and (as_of is None or _in_force(row, as_of)):
            out.append((row, f"withdrawn on {row.status_date}"))
        else:
            standing.append(row)
    return standing, out


def _in_force(row: PollRow, day: date) -> bool:
    return row.status_date is not None and row.status_date <= day and row.published <= day


def check_history(rows: Sequence[PollRow], *, broken: frozenset[str], file: str) -> Iterator[Problem]:
    """Corrections must point at one poll, one each, and never in a circle.

    Parameters
    ----------
    broken
        Identifiers of polls whose rows could not be read: they exist all the same.
    """
    first_of = {row.poll: row for row in reversed(rows)}
    corrected: dict[str, PollRow] = {}
    for row in rows:
        if not row.replaces or row.replaces == row.poll:
            continue
        target = first_of.get(row.replaces)
        if target is None:
            if row.replaces not in broken:
                yield Problem(
                    file, row.row, "replaces", f'"{row.replaces}"', "the identifier of another poll",
                    _replaces_remedy(row, first_of), Rule.REPLACES,
                )  # fmt: skip
            continue
        earlier = corrected.setdefault(row.replaces, row)
        if earlier.poll != row.poll:
            yield Problem(
                file, row.row, "replaces", f'"{row.replaces}", already replaced in row {earlier.row}',
                "one correction of each poll",
                f'Let the later correction replace the earlier one ("{earlier.poll}").', Rule.REPLACES,
            )  # fmt: skip
        if row.status_date is not None and row.status_date < target.published:
            yield Problem(
                file, row.row, "status_date", row.status_date.isoformat(),
                f"the day {target.poll} was published ({target.published}) or later",
                "Correct one of the two.", Rule.STATUS,
            )  # fmt: skip
        if _leads_back(row, first_of):
            yield Problem(
                file, row.row, "replaces", f'"{row.replaces}", which in the end replaces this poll',
                "corrections that lead to an original", "Break the circle.", Rule.REPLACES,
            )  # fmt: skip


def _replaces_remedy(row: PollRow, first_of: dict[str, PollRow]) -> str:
    own_house = [poll for poll, first in first_of.items() if first.house == row.house and poll != row.poll]
    return f"{did_you_mean(row.replaces, own_house)} A blank poll cell is named after house and end."


def _leads_back(row: PollRow, first_of: dict[str, PollRow]) -> bool:
    seen, current = {row.poll}, row
    while current.replaces in first_of:
        current = first_of[current.replaces]
        if current.poll in seen:
            return current.poll == row.poll
        seen.add(current.poll)
    return False
