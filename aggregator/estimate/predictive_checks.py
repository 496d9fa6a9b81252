r"""Whether the published figures look like figures the model would have expected.

For each poll the model is asked, without that poll, what it would have published: replicated answers are
drawn from the posterior predictive distribution and weighed by Pareto-smoothed importance sampling as if the
poll had been left out (Vehtari, Gelman & Gabry 2017). A figure's rank among them is its probability integral
transform; over many figures ranks are uniform where noise and leans are as the model has them.

Whether a house stands out is judged by one number for each of its rows of figures, how far it lies from what
was expected: the figures of one row add up to 100, so that their ranks are no independent evidence. The ranks
of these distances are held against the simultaneous band of Säilynoja, Bürkner & Vehtari (2022), as arviz
computes it.

References
----------
.. [1] Vehtari, A., Gelman, A. and Gabry, J. (2017). Practical Bayesian model evaluation using leave-one-out
   cross-validation and WAIC. Statistics and Computing 27, 1413–1432. doi:10.1007/s11222-016-9696-4
.. [2] Säilynoja, T., Bürkner, P.-C. and Vehtari, A. (2022). Graphical test for discrete uniformity and its
   applications in goodness-of-fit evaluation and multiple sample comparison. Statistics and Computing 32, 32.
   doi:10.1007/s11222-022-10090-6
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import pandas as pd
from arviz_stats.base import array_stats
from arviz_stats.ecdf_utils import ecdf_pit

from aggregator.estimate.parameters import Parameters
from aggregator.estimate.poll_fit import answers_log_likelihood, expected_answers
from aggregator.inputs.contest import OTHERS, Alliance
from models.arrays import ElectionArrays, Floats, RowArrays
from models.poll_answers import kept_cells

DRAWS_IN_ALL = 1000
DRAWS_AT_ONCE = 100
# Chance that some house of an honest register stands out.
FALSE_ALARMS = 0.02
BAND_SIMULATIONS = 4_000
# With fewer rows the band is too wide to be left.
FEWEST_ROWS = 5
COLUMNS = ("house", "code", "figures", "inside_50", "inside_90", "mean_z", "spread_z", "stands_out")


@dataclass(frozen=True)
class Expectation:
    """What the model expects of every row, draw by draw, and how likely each poll's answers are.

    Attributes
    ----------
    cells
        Expected share of each cell, dims (sample, row, cell).
    precision
        α of the Dirichlet-multinomial, dims (sample, row).
    log_likelihood
        Log density of each row's figures, dims (sample, row).
    """

    cells: Floats
    precision: Floats
    log_likelihood: Floats


@dataclass(frozen=True)
class FigureRanks:
    """Where the published figures lie among those the model would have expected.

    Attributes
    ----------
    low, high
        Rank of the lower and of the upper end of what a figure may stand for, 0–1, dims (row, cell); the same
        for a figure that is not only known as an interval. NaN in unused cells.
    distance
        Figure minus expectation in standard deviations of the expectation, dims (row, cell); zero where the
        expectation lies inside a figure's interval.
    row_rank
        Rank of a row's squared distances, summed over its figures, 0–1, dims (row).
    """

    low: Floats
    high: Floats
    distance: Floats
    row_rank: Floats


def summarise_predictive(
    parameters: Parameters, *, arrays: ElectionArrays, alliances: Iterable[Alliance], rng: np.random.Generator
) -> pd.DataFrame:
    """Hold every house's published figures against what the model would have expected.

    Parameters
    ----------
    parameters
        Draws of the parameters.
    arrays
        What the model was given.
    alliances
        Alliances that a figure may stand for.
    rng
        For the replicated answers and for the band.

    Returns
    -------
    pd.DataFrame
        Columns ``house``, ``code``, ``figures``, ``inside_50``, ``inside_90`` (percent), ``mean_z``,
        ``spread_z``, ``stands_out`` ("yes" or "no"; "" in rows of one code). One row per house and code, one
        per house with a blank code, and first one with both blank.
    """
    total = len(parameters.kappa)
    samples = np.arange(0, total, max(1, total // DRAWS_IN_ALL))
    parts = [
        _expect(parameters, arrays=arrays, samples=part)
        for part in np.array_split(samples, max(1, len(samples) // DRAWS_AT_ONCE))
    ]
    expectation = Expectation(
        cells=np.concatenate([part.cells for part in parts]),
        precision=np.concatenate([part.precision for part in parts]),
        log_likelihood=np.concatenate([part.log_likelihood for part in parts]),
    )
    ranks = rank_figures(arrays.rows, expectation=expectation, rng=rng)
    codes = figure_codes(arrays.rows.partition, parties=arrays.country.parties, alliances=alliances)
    return tabulate_ranks(ranks, rows=arrays.rows, codes=codes, rng=rng)


def _expect(parameters: Parameters, *, arrays: ElectionArrays, samples: np.ndarray) -> Expectation:
    expected = expected_answers(parameters, arrays=arrays, samples=samples)
    return Expectation(
        cells=expected.cells,
        precision=expected.precision,
        log_likelihood=answers_log_likelihood(arrays.rows, expected=expected),
    )


def rank_figures(rows: RowArrays, *, expectation: Expectation, rng: np.random.Generator) -> FigureRanks:
    """Rank each published figure among replicated ones, as if its poll had been left out.

    Parameters
    ----------
    rows
        The published figures.
    expectation
        What the model expects of them.
    rng
        For the replicated answers.
    """
    replicated = draw_answers(rows, expectation=expectation, rng=rng)
    weight = _weight_without_poll(rows, expectation.log_likelihood)
    low, high = rows.answers.copy(), rows.answers.copy()
    low[rows.small_row, rows.small_cell] = rows.small_low
    high[rows.small_row, rows.small_cell] = rows.small_high
    mean = np.einsum("sr,src->rc", weight, replicated)
    variance = np.einsum("sr,src->rc", weight, (replicated - mean) ** 2)
    sd = np.sqrt(np.maximum(variance, 1e-12))
    distance = (np.clip(mean, low, high) - mean) / sd
    kept = kept_cells(rows)
    found = ((rows.answers - mean) ** 2 / sd**2 * kept).sum(axis=-1)
    usual = ((replicated - mean) ** 2 / sd**2 * kept).sum(axis=-1)
    used = rows.used > 0
    below = np.einsum("sr,src->rc", weight, replicated < low)
    up_to = np.einsum("sr,src->rc", weight, replicated <= high)
    # A figure that is one number has one rank, in the middle of the replicates that equal it.
    middle = (below + up_to) / 2
    single = kept > 0
    return FigureRanks(
        low=np.where(used, np.where(single, middle, below), np.nan),
        high=np.where(used, np.where(single, middle, up_to), np.nan),
        distance=np.where(used, distance, np.nan),
        row_rank=(weight * (usual < found)).sum(axis=0),
    )


def draw_answers(rows: RowArrays, *, expectation: Expectation, rng: np.random.Generator) -> Floats:
    """Replicated answers of every row, Dirichlet-multinomial; dims (sample, row, cell), unit: respondents."""
    weight = expectation.precision[..., None] * expectation.cells * (rows.used > 0)
    gamma = rng.gamma(weight)
    share = gamma / gamma.sum(axis=-1, keepdims=True)
    return rng.multinomial(np.round(rows.respondents).astype(int), share).astype(float)


def _weight_without_poll(rows: RowArrays, log_likelihood: Floats) -> Floats:
    """Weights that make the draws those of a fit without a row's poll, dims (sample, row), sum one."""
    by_poll = np.zeros((len(rows.polls), len(log_likelihood)))
    np.add.at(by_poll, rows.poll_of_row, log_likelihood.T)
    log_weight, _ = array_stats.psislw(by_poll, axis=-1)
    weight = np.exp(log_weight - log_weight.max(axis=-1, keepdims=True))
    return (weight / weight.sum(axis=-1, keepdims=True))[rows.poll_of_row].T


def figure_codes(
    partition: Floats, *, parties: tuple[str, ...], alliances: Iterable[Alliance]
) -> list[list[str]]:
    """Code that each cell stands for, by row: a party, an alliance, else whatever is left to others.

    Parameters
    ----------
    partition
        Which parties a cell holds, dims (row, cell, party).
    parties
        Codes along the last dim.
    alliances
        Alliances a cell may stand for.
    """
    names = {frozenset([party]): party for party in parties}
    names |= {frozenset(alliance.members): alliance.code for alliance in alliances}
    return [
        [names.get(frozenset(np.array(parties)[cell > 0].tolist()), OTHERS) for cell in row]
        for row in partition
    ]


def tabulate_ranks(
    ranks: FigureRanks, *, rows: RowArrays, codes: list[list[str]], rng: np.random.Generator
) -> pd.DataFrame:
    """Count figures inside the central intervals, by house and code; name the houses that stand out.

    Parameters
    ----------
    ranks
        Where the figures lie.
    rows
        Whose figures they are.
    codes
        What each cell stands for, by row.
    rng
        For the band.

    Returns
    -------
    pd.DataFrame
        As `summarise_predictive` has it.
    """
    row, cell = np.nonzero(rows.used)
    houses = np.array(rows.houses, dtype=object)
    figures = pd.DataFrame(
        {
            "house": houses[rows.house_of_row[row]],
            "code": [codes[r][c] for r, c in zip(row, cell, strict=True)],
            "inside_50": _overlaps(ranks, row, cell, central=0.5),
            "inside_90": _overlaps(ranks, row, cell, central=0.9),
            "z": ranks.distance[row, cell],
        }
    )
    everything = _summary(figures.assign(house="", code=""))
    by_house = _summary(figures.assign(code="")).assign(stands_out="no")
    judged = [name for name, count in _rows_by_house(rows).items() if count >= FEWEST_ROWS]
    for house in judged:
        own = ranks.row_rank[rows.house_of_row == rows.houses.index(house)]
        if leaves_band(own, chance=FALSE_ALARMS / len(judged), rng=rng):
            by_house.loc[by_house["house"] == house, "stands_out"] = "yes"
    table = pd.concat([everything, by_house, _summary(figures)], ignore_index=True)
    return table.assign(stands_out=table["stands_out"].fillna(""))[list(COLUMNS)]


def leaves_band(ranks: Floats, *, chance: float, rng: np.random.Generator) -> bool:
    """Whether ranks that should be uniform leave the simultaneous band of their cumulative distribution.

    Parameters
    ----------
    ranks
        Between 0 and 1.
    chance
        Chance that uniform ranks leave it.
    rng
        For the simulations that set the band.
    """
    _, found, lower, upper = ecdf_pit(ranks, ci_prob=1 - chance, n_simulations=BAND_SIMULATIONS, rng=rng)
    return bool(((found < lower) | (found > upper)).any())


def _overlaps(ranks: FigureRanks, row: np.ndarray, cell: np.ndarray, *, central: float) -> np.ndarray:
    outside = (1 - central) / 2
    return (ranks.high[row, cell] >= outside) & (ranks.low[row, cell] <= 1 - outside)


def _rows_by_house(rows: RowArrays) -> dict[str, int]:
    counts = np.bincount(rows.house_of_row, minlength=len(rows.houses))
    return dict(zip(rows.houses, counts.tolist(), strict=True))


def _summary(figures: pd.DataFrame) -> pd.DataFrame:
    grouped = figures.groupby(["house", "code"], sort=True)
    return grouped.agg(
        figures=("z", "size"),
        inside_50=("inside_50", lambda inside: 100.0 * inside.mean()),
        inside_90=("inside_90", lambda inside: 100.0 * inside.mean()),
        mean_z=("z", "mean"),
        spread_z=("z", lambda z: float(np.sqrt((z**2).mean()))),
    ).reset_index()
