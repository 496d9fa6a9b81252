"""From the register's rows to rows of cells: which parties each published figure stands for."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date

import numpy as np
import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.desk_inputs import DeskInputs
from models.arrays import Floats, Indices

# A regional row below this many respondents cannot bear its poll's design effect; such rows are merged.
LEAST_RESPONDENTS = 30
# A figure below this many rounding steps of its house is only known as an interval.
SMALL_STEPS = 2


@dataclass(frozen=True)
class Row:
    """One row before it becomes numbers: whom it asked, and each figure with the parties it stands for."""

    poll: str
    house: str
    start: date
    end: date
    regions: tuple[str, ...]
    respondents: float
    poll_respondents: float
    weighting_known: bool
    step: float
    method: str
    mode: str
    population: str
    together: tuple[str, ...]
    cells: tuple[tuple[frozenset[str], float], ...]


@dataclass(frozen=True)
class CellArrays:
    """The figures of all rows; the fields are those of ``models.arrays.RowArrays``."""

    partition: Floats
    answers: Floats
    used: Floats
    small_row: Indices
    small_cell: Indices
    small_low: Floats
    small_high: Floats


def read_rows(inputs: DeskInputs) -> list[Row]:
    """Read the used rows of the register, those too small to stand alone merged within their poll."""
    return _merge_small([_row(record, inputs.contest) for record in inputs.polls.to_dict("records")])


def _row(record: dict, contest: Contest) -> Row:
    present = {p for p in contest.party_codes if any(contest.stands_in(p, r) for r in record["regions"])}
    cells: list[tuple[frozenset[str], float]] = []
    for code, members in _columns(contest).items():
        share = record.get(code, np.nan)
        standing = frozenset(members) & present
        if standing and not pd.isna(share):
            cells.append((standing, float(share)))
    rest = frozenset(present.difference(*(members for members, _ in cells)))
    if rest and not pd.isna(record["remainder"]):
        cells.append((rest, max(float(record["remainder"]), 0.0)))
    known = not pd.isna(record["effective"])
    size, poll_size = float(record["respondents"]), float(record["poll_respondents"])
    if known:
        part = float(record["effective"]) / size
        size, poll_size = size * part, poll_size * part
    return Row(
        poll=record["poll"],
        house=record["house"],
        start=record["start"].date(),
        end=record["end"].date(),
        regions=tuple(record["regions"]),
        respondents=size,
        poll_respondents=max(poll_size, size),
        weighting_known=known,
        step=float(record["rounding_step"]),
        method=record["method"],
        mode=record["mode"],
        population=record["population"],
        together=tuple(
            alliance.code
            for alliance in contest.alliances
            if not pd.isna(record.get(alliance.code, np.nan)) and alliance.active_on(record["end"].date())
        ),
        cells=tuple(cells),
    )


def _columns(contest: Contest) -> dict[str, tuple[str, ...]]:
    """Parties behind each figure's column: a party itself, an alliance's members."""
    return {p: (p,) for p in contest.party_codes} | {a.code: a.members for a in contest.alliances}


def _merge_small(rows: list[Row]) -> list[Row]:
    """Merge rows of one poll that are too small to stand alone, smallest first, where their cells agree."""
    merged: list[Row] = []
    by_poll: dict[str, list[Row]] = {}
    for row in rows:
        by_poll.setdefault(row.poll, []).append(row)
    for group in by_poll.values():
        left = sorted(group, key=lambda r: r.respondents)
        while len(left) > 1 and left[0].respondents < LEAST_RESPONDENTS:
            smallest = left.pop(0)
            partner = next((r for r in left if _same_cells(r, smallest)), None)
            if partner is None:
                merged.append(smallest)
                continue
            left[left.index(partner)] = _merge(smallest, partner)
            left.sort(key=lambda r: r.respondents)
        merged.extend(left)
    return merged


def _same_cells(one: Row, other: Row) -> bool:
    return {m for m, _ in one.cells} == {
        m for m, _ in other.cells
    } and one.weighting_known == other.weighting_known


def _merge(one: Row, other: Row) -> Row:
    size = one.respondents + other.respondents
    share = {m: s * one.respondents / size for m, s in one.cells}
    return replace(
        one,
        start=min(one.start, other.start),
        end=max(one.end, other.end),
        regions=one.regions + other.regions,
        respondents=size,
        step=max(one.step, other.step),
        cells=tuple((m, share[m] + s * other.respondents / size) for m, s in other.cells),
    )


def cell_arrays(rows: list[Row], *, parties: tuple[str, ...]) -> CellArrays:
    """Put the figures of all rows into arrays; shares become answers, of those who chose a cell."""
    position = {p: i for i, p in enumerate(parties)}
    width = max(len(row.cells) for row in rows)
    partition = np.zeros((len(rows), width, len(parties)))
    answers, used = np.zeros((len(rows), width)), np.zeros((len(rows), width))
    small: list[tuple[int, int, float, float]] = []
    for i, row in enumerate(rows):
        total = sum(share for _, share in row.cells)
        for c, (members, share) in enumerate(row.cells):
            partition[i, c, [position[m] for m in members]] = 1
            used[i, c] = 1
            answers[i, c] = share / total * row.respondents
            if row.step > 0 and share < SMALL_STEPS * row.step:
                low, high = max(share - row.step / 2, 0), share + row.step / 2
                small.append((i, c, low / total * row.respondents, high / total * row.respondents))
    rows_small, cells_small, low_small, high_small = zip(*small, strict=True) if small else ((), (), (), ())
    return CellArrays(
        partition=partition,
        answers=answers,
        used=used,
        small_row=np.array(rows_small, dtype=np.int64),
        small_cell=np.array(cells_small, dtype=np.int64),
        small_low=np.array(low_small, dtype=float),
        small_high=np.array(high_small, dtype=float),
    )
