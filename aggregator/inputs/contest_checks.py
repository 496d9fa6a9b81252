"""What a contest must agree with itself on: codes, members, periods, polling days, counting."""

from __future__ import annotations

import re
from collections.abc import Iterator
from datetime import date, timedelta
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from aggregator.inputs.contest import OTHERS, WHOLE_COUNTRY, Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.contest_references import check_references
from aggregator.inputs.counting_keys import check_counting
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import REGISTER_COLUMNS, RESULT_COLUMNS
from aggregator.problems import Problem, Severity

_CODE = re.compile(r"[^\W_][\w-]{0,19}")

# Phases of one election lie within weeks of each other; a wider gap is more likely a wrong month or year.
WIDEST_PHASES = timedelta(days=92)


def check_contest(contest: Contest) -> list[Problem]:
    """Find everything that is wrong or doubtful within ``contest.toml``."""
    return [
        *_check_codes(contest),
        *_check_parties(contest),
        *_check_alliances(contest),
        *_check_regions(contest),
        *_check_polling_days(contest),
        *_check_counts(contest),
        *_check_jolts(contest),
        *_check_silence(contest),
        *check_counting(contest),
    ]


def _problem(
    key: str, found: str, expected: str, remedy: str, rule: Rule, severity: Severity = Severity.ERROR
) -> Problem:
    return Problem(CONTEST_FILE, None, key, found, expected, remedy, rule, severity)


def _check_codes(contest: Contest) -> Iterator[Problem]:
    columns = [(f"party[{i}].code", p.code) for i, p in enumerate(contest.parties, start=1)]
    columns += [(f"alliance[{i}].code", a.code) for i, a in enumerate(contest.alliances, start=1)]
    regions = [(f"region[{i}].code", r.code) for i, r in enumerate(contest.regions, start=1)]
    taken = {*REGISTER_COLUMNS, *RESULT_COLUMNS}
    for key, code in columns + regions:
        if not _CODE.fullmatch(code):
            yield _problem(
                key, f'"{code}"', "up to 20 letters, digits, _ or -, the first a letter or digit",
                "Choose a shorter code; the full name belongs in name.", Rule.CODE_FORM,
            )  # fmt: skip
    for key, code in columns:
        if code.casefold() in taken:
            yield _problem(
                key, f'"{code}"', "a code that is not the name of another column", "Choose another code.",
                Rule.CODE_FORM,
            )  # fmt: skip
        if code.casefold() == OTHERS.casefold():
            yield _problem(
                key, f'"{code}"', f"another code: {OTHERS} stands for others",
                "Leave others out of the list: they exist unless the contest says others = false.",
                Rule.CODE_FORM,
            )  # fmt: skip
    for key, code in regions:
        if code.casefold() == WHOLE_COUNTRY.casefold():
            yield _problem(
                key, f'"{code}"', f"another code: {WHOLE_COUNTRY} stands for the whole country",
                "Choose another code.", Rule.CODE_FORM,
            )  # fmt: skip
    for group in (columns, regions):
        first: dict[str, str] = {}
        for key, code in group:
            earlier = first.setdefault(code.casefold(), key)
            if earlier != key:
                yield _problem(
                    key, f'"{code}", already the {earlier}', "each code once (capitals do not count)",
                    "Give one of the two another code.", Rule.CODE_TWICE,
                )  # fmt: skip


def _check_parties(contest: Contest) -> Iterator[Problem]:
    regions = [r.code for r in contest.regions]
    taken: dict[str, float] = {}
    for i, party in enumerate(contest.parties, start=1):
        if party.regions is not None:
            yield from check_references(f"party[{i}].regions", party.regions, known=regions, what="region")
        for donor, part in party.inherits.items():
            key = f"party[{i}].inherits.{donor}"
            taken[donor] = taken.get(donor, 0.0) + part
            if contest.last_result is None:
                yield _problem(
                    key, "votes to inherit", "a contest with a last result",
                    "Add [last_result] with date and file, or delete inherits.", Rule.INHERITS,
                )  # fmt: skip
            if donor == party.code:
                yield _problem(
                    key, "the party's own code", "the column of another party",
                    "Delete it: a party keeps what no one inherits.", Rule.INHERITS,
                )  # fmt: skip
            if taken[donor] > 1 + 1e-9:
                yield _problem(
                    key, f"{taken[donor]:.6g} of {donor}'s votes given away, all parties together",
                    "at most 1", "Lower the parts.", Rule.INHERITS,
                )  # fmt: skip
    kept = [d for d, part in taken.items() if part < 1 - 1e-9 and d not in contest.party_codes]
    if not contest.others:
        for donor in kept:
            yield _problem(
                "others", f"false, while no one inherits {1 - taken[donor]:.6g} of {donor}'s votes",
                "others, to hold them", "Let the parts sum to 1, or allow others.", Rule.INHERITS,
            )  # fmt: skip


def _check_alliances(contest: Contest) -> Iterator[Problem]:
    parties = [p.code for p in contest.parties]
    for i, alliance in enumerate(contest.alliances, start=1):
        key = f"alliance[{i}]"
        yield from check_references(f"{key}.members", alliance.members, known=parties, what="party")
        if len(set(alliance.members)) < 2:
            yield _problem(
                f"{key}.members", f"{len(alliance.members)} member(s)", "two members or more",
                "Name the other members, or delete the alliance.", Rule.MEMBERS,
            )  # fmt: skip
        if alliance.from_ is not None and alliance.until is not None and alliance.from_ > alliance.until:
            yield _backwards(key, alliance.from_, alliance.until)
        for j, other in enumerate(contest.alliances[: i - 1], start=1):
            both = [m for m in alliance.members if m in other.members]
            if both and alliance.meets(other):
                yield _problem(
                    f"{key}.members", f"{', '.join(both)} also in alliance[{j}] ({other.code}) at that time",
                    "a party in one alliance at a time",
                    "Set from and until, unless both are meant; their figures then overlap.",
                    Rule.TWO_ALLIANCES, Severity.WARNING,
                )  # fmt: skip


def _backwards(key: str, start: date, end: date) -> Problem:
    return _problem(
        f"{key}.until", end.isoformat(), f"{start.isoformat()} (from) or later", "Correct one of the two.",
        Rule.PERIOD,
    )  # fmt: skip


def _check_regions(contest: Contest) -> Iterator[Problem]:
    given = [r.electorate is not None for r in contest.regions]
    needed = contest.last_result is None and len(given) > 1
    if all(given) or not (any(given) or needed):
        return
    reason = "in every region" if any(given) else "in every region: without a last result it weighs them"
    for i, region in enumerate(contest.regions, start=1):
        if region.electorate is None:
            yield _problem(
                f"region[{i}].electorate", "no such key", f"a number of voters {reason}",
                "Add the region's electorate.", Rule.ELECTORATE,
            )  # fmt: skip


def _check_polling_days(contest: Contest) -> Iterator[Problem]:
    last = contest.last_result.date if contest.last_result is not None else None
    if last is not None and contest.polling_day <= last:
        yield _problem(
            "polling_day", contest.polling_day.isoformat(), f"a day after the last election ({last})",
            "Correct polling_day, or the date in [last_result].", Rule.POLLING_DAYS,
        )  # fmt: skip
    for i, region in enumerate(contest.regions, start=1):
        day = region.polling_day
        if day is None:
            continue
        if last is not None and day <= last:
            yield _problem(
                f"region[{i}].polling_day", day.isoformat(), f"a day after the last election ({last})",
                "Correct the day.", Rule.POLLING_DAYS,
            )  # fmt: skip
        elif abs(day - contest.polling_day) > WIDEST_PHASES:
            yield _problem(
                f"region[{i}].polling_day", day.isoformat(),
                f"a day within {WIDEST_PHASES.days} days of the contest's ({contest.polling_day})",
                "Check month and year.", Rule.POLLING_DAYS, Severity.WARNING,
            )  # fmt: skip

    days = {contest.polling_day_of(region) for region in contest.region_codes}
    if contest.polling_day not in days:
        yield _problem(
            "polling_day", f"{contest.polling_day}, on which no region votes",
            "a day on which some region votes", "Correct it, or the polling_day of a region.",
            Rule.POLLING_DAYS, Severity.WARNING,
        )  # fmt: skip


def _check_counts(contest: Contest) -> Iterator[Problem]:
    for i, region in enumerate(contest.regions, start=1):
        polling_day = contest.polling_day_of(region.code)
        if region.counted is not None and region.counted < polling_day:
            yield _problem(
                f"region[{i}].counted", region.counted.isoformat(),
                f"the region's polling day ({polling_day}) or later",
                "Correct either; leave counted out until the count is published.", Rule.COUNT_DAY,
            )  # fmt: skip


def _check_jolts(contest: Contest) -> Iterator[Problem]:
    last = contest.last_result.date if contest.last_result is not None else None
    first_of: dict[date, int] = {}
    for i, jolt in enumerate(contest.jolts, start=1):
        key = f"jolt[{i}].date"
        if last is not None and jolt.date <= last:
            yield _problem(
                key, jolt.date.isoformat(), f"a day after the last election ({last})",
                "Correct the date, or delete the jolt: the last result has it already.", Rule.JOLT,
            )  # fmt: skip
        elif jolt.date > contest.last_polling_day:
            yield _problem(
                key, jolt.date.isoformat(), f"polling day ({contest.last_polling_day}) or a day before it",
                "Correct the date, or delete the jolt.", Rule.JOLT,
            )  # fmt: skip
        earlier = first_of.setdefault(jolt.date, i)
        if earlier != i:
            yield _problem(
                key, f"{jolt.date}, already the date of jolt[{earlier}]", "one jolt a day",
                "Make one of the two, with all their weeks.", Rule.JOLT,
            )  # fmt: skip


def _check_silence(contest: Contest) -> Iterator[Problem]:
    regions = [r.code for r in contest.regions]
    for i, silence in enumerate(contest.release.silence, start=1):
        key = f"release.silence[{i}]"
        if silence.from_ > silence.until:
            yield _backwards(key, silence.from_, silence.until)
        yield from check_references(f"{key}.regions", silence.regions or (), known=regions, what="region")
        try:
            ZoneInfo(silence.time_zone)
        except (ZoneInfoNotFoundError, ValueError):
            yield _problem(
                f"{key}.time_zone", f'"{silence.time_zone}"', "a time zone like Europe/Paris",
                "Use a name of the IANA time zone list.", Rule.KEY_VALUE,
            )  # fmt: skip
