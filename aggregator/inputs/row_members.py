"""What stands beside votes in the row of a seat: how many members it elects, and which seats are near."""

from __future__ import annotations

from collections.abc import Iterator

from aggregator.inputs.close_spelling import close_spelling
from aggregator.inputs.contest import Contest
from aggregator.inputs.counting_terms import LIST_RULES, Across, CountingRule
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.result_rows import MEMBERS, region_of
from aggregator.inputs.sheet_table import SheetRow, SheetTable, as_text, quoted
from aggregator.problems import Problem, Severity


def check_members(table: SheetTable, *, contest: Contest) -> Iterator[Problem]:
    """Check that members are whole numbers, and above one only where districts elect several.

    A rule that fills one seat a row gives one finding, at its first row with more.
    """
    if "seats" not in table.columns:
        return
    yield from _check_blanks(table, contest)
    several: dict[CountingRule, list[SheetRow]] = {}
    for row in table.rows:
        if "seats" not in row.cells:
            continue
        text = as_text(row.cells["seats"])
        if not MEMBERS.fullmatch(text):
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
            Rule.SEVERAL_MEMBERS,
        )  # fmt: skip


def _check_blanks(table: SheetTable, contest: Contest) -> Iterator[Problem]:
    """Check that rows whose members are added up, for a region or the country, all say how many."""
    together: dict[object, list[SheetRow]] = {}
    for row in table.rows:
        region = region_of(row, contest=contest)
        terms = contest.terms_in(region)
        if not terms.elects_by_row:
            together.setdefault(region if terms.across is Across.REGION else terms, []).append(row)
    for rows in together.values():
        blank = [row for row in rows if "seats" not in row.cells]
        if len(blank) < len(rows):
            for row in blank:
                yield Problem(
                    table.file, row.number, "seats", "a blank cell", "members in every row, or in none",
                    "Enter how many members the row has of those that lists fill.", Rule.CELL_NEEDED,
                )  # fmt: skip


def check_clusters(table: SheetTable, *, contest: Contest) -> Iterator[Problem]:
    """Look for clusters of one seat, as a slip of the pen makes them; one finding names them all."""
    seats: dict[tuple[str, str], list[SheetRow]] = {}
    for row in table.rows:
        cluster = as_text(row.cells.get("cluster", ""))
        if cluster:
            seats.setdefault((region_of(row, contest=contest), cluster), []).append(row)
    alone = [(cluster, rows[0]) for (_, cluster), rows in seats.items() if len(rows) == 1]
    if not alone:
        return
    named = ", ".join(f'"{cluster}" (row {row.number})' for cluster, row in alone[:5])
    more = f", … ({len(alone)} in total)" if len(alone) > 5 else ""
    labels = {cluster for (_, cluster), rows in seats.items() if len(rows) > 1}
    near = close_spelling(alone[0][0], labels)
    meant = f'If "{near}" is meant, correct it: a' if near else "A"
    yield Problem(
        table.file, alone[0][1].number, "cluster", f"{named}{more}, of one seat each",
        "two seats or more of one region in a cluster", f"{meant} seat alone has nobody to move with.",
        Rule.CLUSTER_ALONE, Severity.WARNING,
    )  # fmt: skip
