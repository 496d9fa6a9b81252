"""The list of candidates, held to the seats and parties of the contest."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from datetime import date

import pandas as pd

from aggregator.inputs.candidate_rows import CandidateRow
from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.contest import OTHERS, Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.counting_terms import MIXED_RULES
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity

# So many misspelt seats are compared with all others: each costs some 40 ms where there are 500.
_MOST_COMPARED = 20


@dataclass(frozen=True)
class _Seat:
    """What the last result says of a seat, and whether its row elects its members."""

    name: str
    region: str
    members: int
    elects: bool


def check_candidates(
    rows: Sequence[CandidateRow],
    *,
    contest: Contest,
    last_result: pd.DataFrame | None,
    polled: frozenset[str],
    file: str,
) -> list[Problem]:
    """Find everything wrong with a list whose cells were read.

    Parameters
    ----------
    last_result
        The last result, whose seats the candidates stand in; None where it could not be read.
    polled
        Parties for which some poll has a figure above 0.
    """
    seats = _seats_of(last_result, contest)
    unknown = _rows_by((r for r in rows if r.code and r.code not in contest.party_codes), "code")
    problems = [
        *_check_codes(unknown, contest, file),
        *_check_days(rows, seats, contest, file),
        *_check_left_seats(rows, file),
    ]
    if not seats:
        return problems
    problems += _check_seats(rows, seats, file)
    problems += _check_regions(rows, seats, contest, file)
    problems += _check_twice(rows, seats, file)
    problems += _check_holders(rows, seats, file)
    if not unknown:
        listed = {row.code for row in rows}
        problems += (
            Problem(
                file, None, "code", f"no candidate of {code} in any seat where it could stand",
                "a candidate somewhere, since polls name it",
                f"Add the seats where {code} stands, or leave out seats whose candidates are not all known.",
                Rule.PARTY_WITHOUT_CANDIDATE,
            )
            for code in _parties_nowhere(rows, seats, contest)
            if code in polled and code not in listed
        )  # fmt: skip
    return problems


def check_standing(
    rows: Sequence[CandidateRow],
    *,
    contest: Contest,
    last_result: pd.DataFrame | None,
    polled: frozenset[str],
    day: date,
    live: bool,
    file: str,
) -> list[Problem]:
    """Find what is doubtful about those who stand on the day of the run.

    Parameters
    ----------
    live
        Whether the contest is under way, so that ``day`` is today.
    """
    there = [row for row in rows if row.stands_on(day)]
    problems = [*_check_uncontested(there, file)]
    first = {row.code: row.row for row in reversed(rows)}
    problems += (
        Problem(
            file, first[code], "code", f"no candidate of {code} who stands on {day}, in any of its seats",
            "a candidate somewhere, since polls name it",
            "Its voters find nobody to vote for: right where it has left the race.",
            Rule.PARTY_WITHOUT_CANDIDATE, Severity.WARNING,
        )
        for code in _parties_nowhere(there, _seats_of(last_result, contest), contest)
        if code in polled and code in first
    )  # fmt: skip
    later = [row for row in rows if row.status_date is not None and row.status_date > day]
    if live and later:
        problems.append(
            Problem(
                file, later[0].row, "status_date", f"{later[0].status_date}{_likewise(later)}",
                f"today ({day}) or a day before it", "It changes nothing before that day.",
                Rule.CANDIDATE_DAY, Severity.WARNING,
            )
        )  # fmt: skip
    return problems


def _seats_of(last_result: pd.DataFrame | None, contest: Contest) -> dict[str, _Seat]:
    """List the labelled rows of the last result; none where it could not be read."""
    if last_result is None:
        return {}
    elects = {region: contest.terms_in(region).elects_by_row for region in contest.region_codes}
    columns = (last_result[column] for column in ("seat", "name", "region", "seats"))
    return {
        seat: _Seat(name, region, int(members), elects[region])
        for seat, name, region, members in zip(*columns, strict=True)
        if seat
    }


def _rows_by(rows: Iterable[CandidateRow], column: str) -> dict[str, list[CandidateRow]]:
    groups: dict[str, list[CandidateRow]] = {}
    for row in rows:
        groups.setdefault(getattr(row, column), []).append(row)
    return groups


def _likewise(rows: Sequence[CandidateRow]) -> str:
    """Name the rows after the first that a finding is about too."""
    others = rows[1:]
    if not others:
        return ""
    more = f", … ({len(others)} more in all)" if len(others) > 5 else ""
    return f"; likewise in row(s) {', '.join(str(row.row) for row in others[:5])}{more}"


def _check_codes(unknown: dict[str, list[CandidateRow]], contest: Contest, file: str) -> Iterator[Problem]:
    alliances = {a.code: a for a in contest.alliances}
    for code, group in unknown.items():
        if code in alliances:
            members = " or ".join(alliances[code].members)
            remedy = f"{code} is an alliance: name the party that puts up the candidate, {members}."
        else:
            remedy = did_you_mean(code, contest.party_codes, names=contest.party_names)
        yield Problem(
            file, group[0].row, "code", f'"{code}"{_likewise(group)}', "the code of a party of the contest",
            remedy, Rule.CANDIDATE_PARTY,
        )  # fmt: skip


def _check_days(
    rows: Sequence[CandidateRow], seats: dict[str, _Seat], contest: Contest, file: str
) -> Iterator[Problem]:
    """Check that what changed did so between the last election and polling day."""
    start = contest.last_result.date if contest.last_result is not None else date.min
    for row in rows:
        seat = seats.get(row.seat)
        end = contest.polling_day_of(seat.region) if seat is not None else contest.last_polling_day
        if row.status_date is not None and not start < row.status_date <= end:
            between = f"a day between the last election ({start}) and polling day ({end})"
            yield Problem(
                file, row.row, "status_date", row.status_date.isoformat(),
                between if start > date.min else f"polling day ({end}) or a day before it",
                "Correct the date.", Rule.CANDIDATE_DAY,
            )  # fmt: skip


def _check_left_seats(rows: Sequence[CandidateRow], file: str) -> Iterator[Problem]:
    for seat, group in _rows_by(rows, "seat").items():
        if seat and all(row.withdrawn for row in group):
            yield Problem(
                file, group[-1].row, "status", f"nobody left in {seat}: withdrawn in all of its rows",
                "a candidate who stands",
                "Add who stands there now; without rows, every party of the region stands in a seat.",
                Rule.SEAT_WITHOUT_CANDIDATE,
            )  # fmt: skip


def _check_seats(rows: Sequence[CandidateRow], seats: dict[str, _Seat], file: str) -> Iterator[Problem]:
    """Give one finding per label, or a single one where no label is known."""
    named = _rows_by((row for row in rows if row.seat), "seat")
    unknown = {label: group for label, group in named.items() if label not in seats}
    if len(unknown) > 1 and len(unknown) == len(named):
        labels = ", ".join(f'"{label}"' for label in list(unknown)[:5])
        more = f", … ({len(unknown)} in total)" if len(unknown) > 5 else ""
        yield Problem(
            file, next(iter(unknown.values()))[0].row, "seat",
            f"{labels}{more}, of which none is in the last result",
            f'seats labelled as in the last result, like "{next(iter(seats))}"',
            "Give a seat the same label in both files.", Rule.CANDIDATE_SEAT,
        )  # fmt: skip
        return
    names = {label: seat.name for label, seat in seats.items()}
    for place, (label, group) in enumerate(unknown.items()):
        compared = place < _MOST_COMPARED
        yield Problem(
            file, group[0].row, "seat", f'"{label}"{_likewise(group)}', "a seat of the last result",
            did_you_mean(label, seats, names=names) if compared else "Write the label that it has there.",
            Rule.CANDIDATE_SEAT,
        )  # fmt: skip
    for label, group in named.items():
        if label in seats and not seats[label].elects:
            yield Problem(
                file, group[0].row, "seat",
                f'"{label}" in {seats[label].region}, where lists alone fill the seats{_likewise(group)}',
                "a seat or district that elects members",
                f"Delete its rows, or correct the rule of {seats[label].region} in {CONTEST_FILE}.",
                Rule.CANDIDATE_SEAT,
            )  # fmt: skip


def _check_regions(
    rows: Sequence[CandidateRow], seats: dict[str, _Seat], contest: Contest, file: str
) -> Iterator[Problem]:
    """Give one finding per party and region."""
    away: dict[tuple[str, str], list[CandidateRow]] = {}
    for row in rows:
        if row.seat in seats and row.code in contest.party_codes:
            region = seats[row.seat].region
            if not contest.stands_in(row.code, region):
                away.setdefault((row.code, region), []).append(row)
    for (code, region), group in away.items():
        yield Problem(
            file, group[0].row, "code",
            f'"{code}" in {group[0].seat}, a seat of {region}{_likewise(group)}',
            f"a party that stands in {region}",
            f"Delete the row, or correct regions of {code} in {CONTEST_FILE} if it stands there.",
            Rule.CANDIDATE_PARTY,
        )  # fmt: skip


def _check_twice(rows: Sequence[CandidateRow], seats: dict[str, _Seat], file: str) -> Iterator[Problem]:
    """Check that where one member is elected no party has two candidates at a time; others are many."""
    earlier: dict[tuple[str, str], list[CandidateRow]] = {}
    for row in rows:
        seat = seats.get(row.seat)
        if row.code in ("", OTHERS) or seat is None or not seat.elects or seat.members > 1:
            continue
        before = earlier.setdefault((row.seat, row.code), [])
        first = next((other for other in before if other.meets(row)), None)
        before.append(row)
        if first is not None:
            yield Problem(
                file, row.row, "code", f'"{row.code}" in {row.seat}, already in row {first.row}',
                "each party once where one member is elected",
                "Delete one of the two; if one replaces the other, give both the same status_date: withdrawn "
                "from that day, standing from that day.", Rule.CANDIDATE_TWICE,
            )  # fmt: skip


def _check_holders(rows: Sequence[CandidateRow], seats: dict[str, _Seat], file: str) -> Iterator[Problem]:
    """Check that no seat has more sitting members who stand at a time than it elects."""
    earlier: dict[str, list[CandidateRow]] = {}
    for row in rows:
        seat = seats.get(row.seat)
        if not row.holder or seat is None or not seat.elects:
            continue
        together = [other for other in earlier.get(row.seat, []) if other.meets(row)]
        earlier.setdefault(row.seat, []).append(row)
        if len(together) >= seat.members:
            others = ", ".join(str(other.row) for other in together[:5])
            more = f", … ({len(together)} in total)" if len(together) > 5 else ""
            yield Problem(
                file, row.row, "holder", f'"yes" in {row.seat}, and also in row(s) {others}{more}',
                f"at most {seat.members} in a seat that elects {seat.members}",
                "Keep yes where the candidate sits for the seat now.", Rule.CANDIDATE_HOLDERS,
            )  # fmt: skip


def _check_uncontested(there: Sequence[CandidateRow], file: str) -> Iterator[Problem]:
    """Look for seats where one party alone stands; one finding names them all."""
    alone = [group for group in _rows_by(there, "seat").values() if len({row.code for row in group}) == 1]
    if alone:
        named = ", ".join(f"{group[0].code} alone in {group[0].seat}" for group in alone[:5])
        more = f", … ({len(alone)} in total)" if len(alone) > 5 else ""
        yield Problem(
            file, alone[0][0].row, "seat", f"{named}{more}", "candidates of two parties or more in a seat",
            "Right where a seat is uncontested; else add the others: no party stands that is not listed.",
            Rule.UNCONTESTED, Severity.WARNING,
        )  # fmt: skip


def _parties_nowhere(rows: Sequence[CandidateRow], seats: dict[str, _Seat], contest: Contest) -> list[str]:
    """List the parties that stand in no seat: every seat of theirs is named, and none by one of their rows.

    A party that stands where lists fill seats may well have nobody but those on its list.
    """
    named = {row.seat for row in rows}
    open_to: dict[str, set[str]] = {}
    for label, seat in seats.items():
        open_to.setdefault(seat.region, set()).add(label)
    with_lists = {
        region
        for terms, regions in contest.counting_groups
        for region in regions
        if terms.rule in MIXED_RULES or not terms.elects_by_row
    }
    listed = {row.code for row in rows}
    nowhere = []
    for party in contest.parties:
        regions = {r for r in contest.region_codes if contest.stands_in(party.code, r)}
        its_seats = set().union(*(open_to.get(region, set()) for region in regions))
        if party.code not in listed and not regions & with_lists and its_seats and its_seats <= named:
            nowhere.append(party.code)
    return nowhere
