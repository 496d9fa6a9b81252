"""How many seats a chamber has, part by part: members of rows, seats from lists."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.counting_keys import named_terms
from aggregator.inputs.counting_terms import LIST_RULES, MIXED_RULES, Across, CountingTerms
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem

_NO_KEY = "no such key"


@dataclass(frozen=True)
class ChamberPart:
    """Seats of the chamber that are filled in one way.

    Attributes
    ----------
    what
        Whose seats they are, for a reader.
    table
        Key path of the terms they are filled by.
    seats
        How many; None where the desk's files do not say.
    """

    what: str
    table: str
    seats: int | None


def find_parts(
    contest: Contest, *, last_result: pd.DataFrame, file: str
) -> tuple[list[ChamberPart], list[Problem]]:
    """Find the parts of the chamber and their seats.

    Parameters
    ----------
    contest
        The contest as written; its keys agree with its rules.
    last_result
        The last result, checked.
    file
        Name of its file.

    Returns
    -------
    The parts, and what was found wrong: seats stated twice, or not at all.
    """
    parts: list[ChamberPart] = []
    problems: list[Problem] = []
    for key, written, regions in named_terms(contest):
        terms = written.settled
        rows = last_result[last_result["region"].isin(regions)]
        if not regions:
            continue
        if terms.elects_by_row:
            found = _without_seats(key, terms, rows)
            problems += found
            if not found:
                whose = ", ".join(regions) if contest.counting.where else file
                parts.append(ChamberPart(f"in the rows of {whose}", key, int(rows["seats"].sum())))
        if terms.rule in MIXED_RULES:
            parts.append(_list_part(key, terms, regions, contest))
        elif terms.rule in LIST_RULES and terms.across is Across.REGION:
            more, wrong = _parts_by_region(key, rows, regions, contest, file)
            parts += more
            problems += wrong
        elif terms.rule in LIST_RULES and terms.across is Across.COUNTRY:
            listed = int(rows["seats"].sum()) or None
            problems += _stated_twice(f"{key}.list_seats", terms.list_seats, listed, file)
            parts.append(ChamberPart(_of_lists(key), key, terms.list_seats or listed))
    return parts, problems


def _without_seats(key: str, terms: CountingTerms, rows: pd.DataFrame) -> list[Problem]:
    """Find rows that are no seats where the rule fills seats in rows."""
    if (rows["seat"] != "").all():
        return []
    whole = key == "counting"
    place = "" if whole else f" of {', '.join(dict.fromkeys(rows.loc[rows['seat'] == '', 'region']))}"
    district = "district" if terms.rule in LIST_RULES else "seat"
    return [
        Problem(
            CONTEST_FILE, None, f"{key}.rule", f'"{terms.rule}"',
            f"a last result with one row per {district}{place}",
            "Add the column seat to the last result, or count by another rule"
            + (" (none: votes only)." if whole else "."),
            Rule.COUNTING,
        )
    ]  # fmt: skip


def _list_part(key: str, terms: CountingTerms, regions: tuple[str, ...], contest: Contest) -> ChamberPart:
    """Seats from lists in a mixed chamber."""
    if terms.across is Across.COUNTRY:
        return ChamberPart(_of_lists(key), key, terms.list_seats)
    stated = [r.list_seats for r in contest.regions if r.code in regions]
    known = [seats for seats in stated if seats is not None]
    whole = sum(known) if known and len(known) == len(stated) else None
    return ChamberPart("from lists (list_seats of the regions)", key, whole)


def _of_lists(key: str) -> str:
    return f"from lists ({key}.list_seats)"


def _parts_by_region(
    key: str, rows: pd.DataFrame, regions: tuple[str, ...], contest: Contest, file: str
) -> tuple[list[ChamberPart], list[Problem]]:
    """Seats from lists where each region has lists of its own."""
    stated = {r.code: r.list_seats for r in contest.regions}
    place = {r.code: i for i, r in enumerate(contest.regions, start=1)}
    by_region = rows.groupby("region")["seats"].sum()
    parts, problems = [], []
    for region in regions:
        own, listed = stated.get(region), int(by_region.get(region, 0)) or None
        where = f"region[{place[region]}].list_seats" if region in place else f"{key}.across"
        problems += _stated_twice(where, own, listed, file)
        if own is None and listed is None:
            problems.append(
                Problem(
                    CONTEST_FILE, None, where, _NO_KEY, f"the seats filled from lists of {region}",
                    f"Add the key, or the column seats to {file}.", Rule.COUNTING,
                )
            )  # fmt: skip
        parts.append(ChamberPart(f"from the lists of {region}", key, own or listed))
    return parts, problems


def _stated_twice(key: str, stated: int | None, listed: int | None, file: str) -> list[Problem]:
    if stated is None or listed is None or stated == listed:
        return []
    return [
        Problem(
            CONTEST_FILE, None, key, str(stated), f"{listed}, the sum of the column seats in {file}",
            "Correct one of the two, or delete the key.", Rule.COUNTING,
        )
    ]  # fmt: skip
