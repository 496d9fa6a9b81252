"""Counts of regions that have voted before the others, held to the contest and the last result."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import date

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.result_rows import region_of
from aggregator.inputs.sheet_table import SheetTable
from aggregator.inputs.votes_of_today import read_votes_of_today
from aggregator.problems import Problem, Severity

_UNFINISHED = "While votes are still being counted, leave counted and the region's rows out."


def read_counted_result(
    table: SheetTable, *, contest: Contest, last_result: pd.DataFrame | None
) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read the votes of regions that have been counted; see `read_votes_of_today`."""
    return read_votes_of_today(table, contest=contest, last_result=last_result, unfinished=_UNFINISHED)


def check_counted_regions(table: SheetTable, *, contest: Contest) -> list[Problem]:
    """Check that the file has rows of the regions that the contest calls counted, and of no others."""
    first_row: dict[str, int] = {}
    for row in table.rows:
        first_row.setdefault(region_of(row, contest=contest), row.number)
    regions = {r.code: (i, r) for i, r in enumerate(contest.regions, start=1)}
    problems = []
    for code, number in first_row.items():
        if code in regions and regions[code][1].counted is None:
            problems.append(
                Problem(
                    table.file, number, "region", f"votes in {code}, while region[{regions[code][0]}] of "
                    f"{CONTEST_FILE} has no counted", "rows of regions with the day of their count",
                    "Add counted = the day it was published, or delete the rows.", Rule.COUNT_REGIONS,
                )
            )  # fmt: skip
    for code, (place, region) in regions.items():
        if region.counted is not None and code not in first_row:
            problems.append(
                Problem(
                    table.file, None, "region", f"no row for {code}, counted on {region.counted} "
                    f"(region[{place}] of {CONTEST_FILE})", "votes in every region that has been counted",
                    "Add its rows, or leave counted out until its count is published.", Rule.COUNT_REGIONS,
                )
            )  # fmt: skip
    return problems


def counted_as_of(result: pd.DataFrame | None, *, contest: Contest, day: date) -> pd.DataFrame | None:
    """Keep the rows of regions whose count was published by a day; None where there are none."""
    if result is None:
        return None
    seen = [r.code for r in contest.regions if r.counted is not None and r.counted <= day]
    kept = result[result["region"].isin(seen)].reset_index(drop=True)
    return None if kept.empty else kept


def check_counted_later(contest: Contest, *, day: date) -> Iterator[Problem]:
    """Warn of counts that a contest under way dates after today: they are not seen yet."""
    for i, region in enumerate(contest.regions, start=1):
        if region.counted is not None and region.counted > day:
            yield Problem(
                CONTEST_FILE, None, f"region[{i}].counted", region.counted.isoformat(),
                f"today ({day}) or a day before it", "Its votes are not used before that day.",
                Rule.COUNT_DAY, Severity.WARNING,
            )  # fmt: skip
