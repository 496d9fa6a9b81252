"""Where voters go in a run-off: rates by pair of parties, general rows filled in for all they cover."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import permutations

import pandas as pd

from aggregator.inputs.cell_numbers import NumberKind, read_numbers
from aggregator.inputs.close_spelling import did_you_mean
from aggregator.inputs.contest import Contest
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import TRANSFER_COLUMNS, TRANSFER_NEEDED
from aggregator.inputs.sheet_table import SheetTable, as_text, check_columns, quoted
from aggregator.problems import Problem, Severity

_ANY = ""
_FIGURES = ("rate", "sd")


@dataclass(frozen=True)
class _Row:
    """One row whose figures could be read; a blank code stands for any party."""

    row: int
    donor: str
    heir: str
    rate: float
    sd: float


def read_transfers(table: SheetTable, *, contest: Contest) -> tuple[pd.DataFrame | None, list[Problem]]:
    """Read the rates of transfer.

    Returns
    -------
    Columns ``from``, ``to``, ``rate`` and ``sd`` (percent), one row per ordered pair of party codes, each
    with the figures of the most specific row that covers it: the pair itself, its ``from`` alone, its
    ``to`` alone, neither. None where something is wrong. And what was found.
    """
    problems = check_columns(
        table,
        known=TRANSFER_COLUMNS,
        needed=TRANSFER_NEEDED,
        names={},
        unknown_remedy="Parties stand in the rows, under from and to; remarks belong in note.",
    )
    if not table.rows:
        problems.append(
            Problem(
                table.file, None, None, "a header and no row", "one row or more",
                "Enter a row with from and to left blank, which holds for every pair.", Rule.TABLE_EMPTY,
            )
        )  # fmt: skip
    if any(column not in table.columns for column in TRANSFER_NEEDED):
        return None, problems
    problems += _check_codes(table, contest)
    rows, found = _read_figures(table)
    problems += found
    problems += (p for row in rows for p in _check_spread(row, table.file))
    if table.rows:
        problems += _check_covered(table, contest)
    if any(p.severity is Severity.ERROR for p in problems):
        return None, problems
    stated = {(row.donor, row.heir): row for row in rows}
    chosen = [(pair, stated[_covering(pair, stated)]) for pair in permutations(contest.party_codes, 2)]
    return (
        pd.DataFrame(
            [(donor, heir, row.rate, row.sd) for (donor, heir), row in chosen], columns=[*TRANSFER_NEEDED]
        ),
        problems,
    )


def _codes(table: SheetTable) -> Iterator[tuple[int, str, str]]:
    for row in table.rows:
        donor, heir = (as_text(row.cells.get(column, _ANY)) for column in ("from", "to"))
        yield row.number, donor, heir


def _check_codes(table: SheetTable, contest: Contest) -> Iterator[Problem]:
    first: dict[tuple[str, str], int] = {}
    for number, donor, heir in _codes(table):
        for column, code in (("from", donor), ("to", heir)):
            if code not in (_ANY, *contest.party_codes):
                yield Problem(
                    table.file, number, column, quoted(code), "a party's code, or a blank cell for any",
                    did_you_mean(code, contest.party_codes, names=contest.party_names), Rule.TRANSFER_PAIR,
                )  # fmt: skip
        if donor == heir != _ANY:
            yield Problem(
                table.file, number, "to", f'"{heir}", as in from', "another party",
                "Delete the row: whoever is in the run-off keeps its own voters.", Rule.TRANSFER_PAIR,
            )  # fmt: skip
        earlier = first.setdefault((donor, heir), number)
        if earlier != number:
            yield Problem(
                table.file, number, None, f"{_pair(donor, heir)}, already in row {earlier}", "each pair once",
                "Delete one of the two.", Rule.TRANSFER_PAIR,
            )  # fmt: skip


def _read_figures(table: SheetTable) -> tuple[list[_Row], list[Problem]]:
    numbers, problems = read_numbers(table, kinds=dict.fromkeys(_FIGURES, NumberKind.PERCENT))
    rows = []
    for row, (number, donor, heir) in zip(table.rows, _codes(table), strict=True):
        for column in _FIGURES:
            value = numbers.get((number, column))
            if column not in row.cells:
                wanted = "a percentage of the voters" if column == "rate" else "how unsure it is, in points"
                problems.append(
                    Problem(
                        table.file, number, column, "a blank cell", wanted,
                        "Enter it; an sd of 0 says that the rate is certain.", Rule.CELL_NEEDED,
                    )
                )  # fmt: skip
            elif value is not None and not 0 <= value <= 100:
                problems.append(
                    Problem(
                        table.file, number, column, f"{value:g}", "a number from 0 to 100",
                        "Correct the figure; it is in percent of the voters of from.", Rule.TRANSFER_RATE,
                    )
                )  # fmt: skip
        rate, sd = (numbers.get((number, column), -1.0) for column in _FIGURES)
        if 0 <= rate <= 100 and 0 <= sd <= 100:
            rows.append(_Row(number, donor, heir, rate, sd))
    return rows, problems


def _check_spread(row: _Row, file: str) -> Iterator[Problem]:
    """Check that a beta distribution has this mean and spread; one without spread needs none."""
    widest = (row.rate * (100 - row.rate)) ** 0.5
    if row.sd > 0 and row.sd >= widest:
        expected = f"below {widest:.3g} at a rate of {row.rate:g}" if widest > 0 else f"0 at {row.rate:g}"
        yield Problem(
            file, row.row, "sd", f"{row.sd:g}", expected,
            "Lower it: no share between 0 and 100 can be that unsure.", Rule.TRANSFER_RATE,
        )  # fmt: skip


def _check_covered(table: SheetTable, contest: Contest) -> Iterator[Problem]:
    stated = {(donor, heir) for _, donor, heir in _codes(table)}
    open_ = [p for p in permutations(contest.party_codes, 2) if _covering(p, stated) not in stated]
    if open_:
        named = ", ".join(_pair(*pair) for pair in open_[:5])
        more = f", … ({len(open_)} in total)" if len(open_) > 5 else ""
        yield Problem(
            table.file, None, None, f"no row for {named}{more}", "a rate for every ordered pair",
            "Add them, or a row with from and to left blank, which holds for all others.",
            Rule.TRANSFER_MISSING,
        )  # fmt: skip


def _covering(
    pair: tuple[str, str], stated: set[tuple[str, str]] | dict[tuple[str, str], _Row]
) -> tuple[str, str]:
    """Give the most specific pair that is stated; the general one where none is."""
    donor, heir = pair
    options = ((donor, heir), (donor, _ANY), (_ANY, heir))
    return next((option for option in options if option in stated), (_ANY, _ANY))


def _pair(donor: str, heir: str) -> str:
    return f"{donor or 'any'} to {heir or 'any'}"
