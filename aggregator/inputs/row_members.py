"""How many members each row of a result elects: the column ``seats``."""

from __future__ import annotations

import re
from collections.abc import Iterator

from aggregator.inputs.contest import Contest
from aggregator.inputs.counting_terms import LIST_RULES, CountingRule
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.result_rows import region_of
from aggregator.inputs.sheet_table import SheetRow, SheetTable, as_text, quoted
from aggregator.problems import Problem

_MEMBERS = re.compile(r"[1-9][0-9]{0,3}")


def check_members(table: SheetTable, *, contest: Contest) -> Iterator[Problem]:
    """Check that members are whole numbers, and above one only where districts elect several.

    A rule that fills one seat a row gives one finding, at its first row with more.
    """
    if "seats" not in table.columns:
        return
    several: dict[CountingRule, list[SheetRow]] = {}
    for row in table.rows:
        if "seats" not in row.cells:
            continue
        text = as_text(row.cells["seats"])
        if not _MEMBERS.fullmatch(text):
            yield Problem(
                table.file, row.number, "seats", quoted(row.cells["seats"]),
                "a whole number of members, 1 or more",
                "Enter how many members the row elects; blank stands for one.", Rule.ROW_MEMBERS,
            )  # fmt: skip
            continue
        rule = contest.terms_in(region_of(row, contest=contest)).rule
        if int(text) > 1 and rule not in LIST_RULES and rule is not CountingRule.NONE:
            several.setdefault(rule, []).append(row)
    for rule, rows in several.items():
        others = ", ".join(str(row.number) for row in rows[1:6])
        likewise = f"; more than one likewise in row(s) {others}" if others else ""
        more = f", … ({len(rows)} in total)" if len(rows) > 6 else ""
        yield Problem(
            table.file, rows[0].number, "seats", f"{quoted(rows[0].cells['seats'])}{likewise}{more}",
            f"1: {rule} fills one seat a row",
            f"Enter 1, or count by {' or '.join(sorted(LIST_RULES))} where districts elect several.",
            Rule.ROW_MEMBERS,
        )  # fmt: skip
