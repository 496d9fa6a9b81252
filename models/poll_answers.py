r"""From opinion to published figures.

A row asks in a mix W of regions and reports a partition A of the parties. Its expected shares are
q = A Σ_r W_r softmax(opinion_r + leans), rescaled over the cells it has, and its answers are
Dirichlet-multinomial with precision α = (n − deff)/(deff − 1), whose variance is q(1 − q)·deff/n. Written
with log-gamma functions, weighted percentages × n need not be whole, and merging cells is exact. The
multinomial coefficient, which no parameter enters, is left out.

A figure below two of its house's rounding steps is only known to lie between two counts: the
beta-binomial probability of that interval takes its place ("0 %" means "below half a step").
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt
from scipy.special import gammaln

from models.arrays import Floats, RowArrays

Array = Any

# A sample so small that its design effect would exceed it still tells this part of its respondents.
SMALLEST_EXCESS = 0.05
# Points at which the probability of an interval of counts is summed; wider intervals are sampled evenly.
MOST_COUNTS = 12


def cell_shares(share: Array, *, partition: Array, used: Array) -> Array:
    """Expected share of each cell, rescaled over the row's cells; one if unused; dims (…, row, cell)."""
    cells = (partition * share[..., None, :]).sum(axis=-1) * used
    return cells / cells.sum(axis=-1, keepdims=True) + (1 - used)


def answer_precision(*, respondents: Array, design_effect: Array, larger: Callable) -> Array:
    """α of the Dirichlet-multinomial, dims (…, row); ``larger`` is the elementwise maximum to use."""
    return larger(respondents - design_effect, SMALLEST_EXCESS * respondents) / (design_effect - 1)


def answers_log_density(
    answers: Array, *, cells: Array, precision: Array, kept: Array, log_gamma: Callable
) -> Array:
    """Dirichlet-multinomial log density of each row's kept cells, without its coefficient; dims (…, row)."""
    weight = precision[..., None] * cells
    kept_weight = (weight * kept).sum(axis=-1)
    kept_answers = (answers * kept).sum(axis=-1)
    single = ((log_gamma(answers + weight) - log_gamma(weight)) * kept).sum(axis=-1)
    return log_gamma(kept_weight) - log_gamma(kept_answers + kept_weight) + single


def small_cells_log_density(
    counts: Array,
    *,
    log_count_weight: Array,
    weight: Array,
    precision: Array,
    respondents: Array,
    log_gamma: Callable,
    exp: Callable,
    log: Callable,
) -> Array:
    """Log probability that a beta-binomial count lies in an interval; dims (…, small).

    Parameters
    ----------
    counts
        Counts inside the interval, dims (small, count).
    log_count_weight
        Log of the coefficient and of the number of counts each stands for, dims (small, count); very
        negative for padding.
    weight, precision, respondents
        α q of the cell, α and n of its row, dims (…, small).
    """
    a, total, n = weight[..., None], precision[..., None], respondents[..., None]
    terms = (
        log_count_weight
        + log_gamma(counts + a)
        - log_gamma(a)
        + log_gamma(n - counts + total - a)
        - log_gamma(total - a)
        + log_gamma(total)
        - log_gamma(n + total)
    )
    highest = terms.max(axis=-1, keepdims=True)
    return log(exp(terms - highest).sum(axis=-1)) + highest[..., 0]


@dataclass(frozen=True)
class SmallCounts:
    """The counts an interval cell may stand for, padded to one width; dims (small, count)."""

    counts: Floats
    log_count_weight: Floats


def small_counts(rows: RowArrays) -> SmallCounts:
    """Counts inside each interval and the log of their coefficients."""
    size = len(rows.small_row)
    counts = np.zeros((size, MOST_COUNTS))
    log_weight = np.full((size, MOST_COUNTS), -1e10)
    for i, (row, low, high) in enumerate(zip(rows.small_row, rows.small_low, rows.small_high, strict=True)):
        n = rows.respondents[row]
        first, last = np.ceil(low), max(np.floor(min(high, n)), np.ceil(low))
        inside = last - first + 1
        points = int(min(inside, MOST_COUNTS))
        # Midpoints of equal stretches of the interval; with few counts these are the counts themselves.
        y = first - 0.5 + (np.arange(points) + 0.5) * inside / points
        y = np.clip(y, 0, n)
        counts[i, :points] = y
        log_weight[i, :points] = (
            gammaln(n + 1) - gammaln(y + 1) - gammaln(n - y + 1) + np.log(inside / points)
        )
    return SmallCounts(counts=counts, log_count_weight=log_weight)


def kept_cells(rows: RowArrays) -> Floats:
    """Used cells that are not only known as intervals; dims (row, cell)."""
    kept = rows.used.copy()
    kept[rows.small_row, rows.small_cell] = 0
    return kept


def add_answers(*, answers: Array, cells: Array, precision: Array, kept: Array) -> Array:
    """Put the published figures into the current model as observed Dirichlet-multinomial rows."""

    def log_density(value: Array, precision: Array, cells: Array, kept: Array) -> Array:
        return answers_log_density(value, cells=cells, precision=precision, kept=kept, log_gamma=pt.gammaln)

    def draw(precision: Array, cells: Array, kept: Array, rng: Any = None, size: Any = None) -> Array:
        weight = np.where(kept > 0, precision[..., None] * cells, 0)
        gamma = rng.gamma(np.maximum(weight, 1e-12)) * (kept > 0)
        share = gamma / np.maximum(gamma.sum(axis=-1, keepdims=True), 1e-300)
        total = np.round((answers.get_value() * kept).sum(axis=-1)).astype(int)
        return np.stack([rng.multinomial(n, p / p.sum()) for n, p in zip(total, share, strict=True)]).astype(
            float
        )

    return pm.CustomDist(
        "answers",
        precision,
        cells,
        kept,
        logp=log_density,
        random=draw,
        signature="(),(c),(c)->(c)",
        observed=answers,
    )


def add_small_cells(
    *, counts: Array, log_count_weight: Array, weight: Array, precision: Array, respondents: Array
) -> Array:
    """Put the interval cells into the current model."""

    def log_density(
        value: Array, weight: Array, precision: Array, respondents: Array, log_count_weight: Array
    ) -> Array:
        return small_cells_log_density(
            value,
            log_count_weight=log_count_weight,
            weight=weight,
            precision=precision,
            respondents=respondents,
            log_gamma=pt.gammaln,
            exp=pt.exp,
            log=pt.log,
        )

    def draw(
        weight: Array,
        precision: Array,
        respondents: Array,
        log_count_weight: Array,
        rng: Any = None,
        size: Any = None,
    ) -> Array:
        chance = rng.beta(weight, np.maximum(precision - weight, 1e-9))
        count = rng.binomial(np.round(respondents).astype(int), chance).astype(float)
        return np.broadcast_to(count[..., None], (*count.shape, MOST_COUNTS)).copy()

    return pm.CustomDist(
        "small_answers",
        weight,
        precision,
        respondents,
        log_count_weight,
        logp=log_density,
        random=draw,
        signature="(),(),(),(k)->(k)",
        observed=counts,
    )
