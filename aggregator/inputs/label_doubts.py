"""Labels of the register that may not mean what they say: modes, populations, ways of working."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator, Sequence
from itertools import combinations

from aggregator.inputs.close_spelling import close_spelling, nearly_same
from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.poll_breakdowns import rows_by_poll
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_doubts import listed, warning
from aggregator.problems import Problem


def check_labels(rows: Sequence[PollRow], *, contest: Contest, file: str) -> list[Problem]:
    """Find all doubts about the labels of the rows that enter."""
    return [
        *_check_spellings(rows, file),
        *_check_methods(rows, file),
        *_check_blank_methods(rows, file),
        *_check_target_population(rows, contest),
    ]


def _by_house(rows: Sequence[PollRow]) -> dict[str, list[PollRow]]:
    """Group one row of each poll by house."""
    houses: dict[str, list[PollRow]] = defaultdict(list)
    for group in rows_by_poll(rows).values():
        houses[group[0].house].append(group[0])
    return houses


def _check_spellings(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    yield from _check_spelling_of("house", rows, file)
    yield from _check_spelling_of("mode", rows, file)
    yield from _check_spelling_of("population", rows, file)
    for of_house in _by_house(rows).values():
        yield from _check_spelling_of("method", of_house, file)


def _check_spelling_of(column: str, rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    counts = Counter(getattr(row, column) for row in rows)
    counts.pop("", None)
    for first, second in combinations(sorted(counts), 2):
        if nearly_same(first, second):
            # The spelling used less often is the likelier slip.
            slip, usual = sorted((first, second), key=lambda n: (counts[n], n))
            row = min(r.row for r in rows if getattr(r, column) == slip)
            yield warning(
                file, row, column, f'"{slip}", nearly "{usual}"', "one spelling of each name",
                "They are read as two; if it is one, write it in one way.", Rule.NEARLY_SAME_NAME,
            )  # fmt: skip


def _check_methods(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    """Look for labels that are no house's own: the words of two houses, or of the column ``mode``."""
    modes = {row.mode.casefold(): row for row in reversed(rows) if row.mode}
    labelled: dict[str, list[PollRow]] = defaultdict(list)
    for row in rows:
        if row.method:
            labelled[row.method.casefold()].append(row)
    for label, group in labelled.items():
        first = min(group, key=lambda r: r.row)
        houses = list(dict.fromkeys(row.house for row in sorted(group, key=lambda r: r.row)))
        mode = modes.get(label)
        if len(houses) > 1:
            more = f" and {len(houses) - 2} more" if len(houses) > 2 else ""
            found = f'"{first.method}" of {houses[0]} and also of {houses[1]}{more}'
        elif mode is not None:
            found = f'"{first.method}", which is a mode in row {mode.row}'
        else:
            continue
        yield warning(
            file, first.row, "method", found, "a house's own label",
            "Each house's label is read by itself; if it says how people were reached, write it in mode.",
            Rule.METHOD_LABEL,
        )  # fmt: skip


def _check_blank_methods(rows: Sequence[PollRow], file: str) -> Iterator[Problem]:
    for house, polls in _by_house(rows).items():
        labelled = [row for row in polls if row.method]
        if not labelled:
            continue
        first = min(labelled, key=lambda r: (r.end, r.row))
        after = [row for row in polls if not row.method and row.end > first.end]
        if after:
            yield warning(
                file, min(row.row for row in after), "method",
                f'a blank cell in {listed(after)}, after "{first.method}" in row {first.row}',
                f"a label in every poll of {house} since then",
                "Blank is read as the way of working before its first label; write the label that holds.",
                Rule.METHOD_BLANK,
            )  # fmt: skip


def _check_target_population(rows: Sequence[PollRow], contest: Contest) -> Iterator[Problem]:
    target = contest.model.target_population
    counts = Counter(row.population for row in rows if row.population)
    if not counts or target in counts:
        return
    labels = sorted(counts, key=lambda label: (-counts[label], label))
    near = close_spelling(target, labels)
    meant = f'Did you mean "{near}"? ' if near is not None else ""
    more = f", … ({len(labels)} in total)" if len(labels) > 5 else ""
    yield warning(
        CONTEST_FILE, None, "model.target_population",
        f'"{target}", while the register says {", ".join(labels[:5])}{more}',
        "a label of the register's population column",
        f"{meant}Set it to the label nearest to those who vote; as it is, all of these are read as leaning "
        f"away from {target}, by amounts no poll can show.", Rule.TARGET_POPULATION,
    )  # fmt: skip
