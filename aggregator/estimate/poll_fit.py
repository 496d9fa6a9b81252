"""How the model sees each poll: what it expected, how likely the figures are, which ones it leans on."""

from __future__ import annotations

import warnings
from dataclasses import dataclass

import arviz as az
import numpy as np
import xarray as xr
from scipy.special import gammaln

from aggregator.estimate.parameters import Parameters
from aggregator.estimate.support import between_knots, support_at_knots
from models.arrays import ElectionArrays, Floats, RowArrays
from models.design_effect import row_design_effect
from models.dimensions import CHAIN, DRAW, POLL
from models.poll_answers import (
    answer_precision,
    answers_log_density,
    cell_shares,
    kept_cells,
    small_cells_log_density,
    small_counts,
)

# Draws in all that Pareto-k is estimated from: enough for a warning, at a quarter of the time.
DRAWS_FOR_PARETO_K = 1000
DRAWS_AT_ONCE = 100


@dataclass(frozen=True)
class ExpectedAnswers:
    """What the model expects of every row, draw by draw.

    Attributes
    ----------
    cells
        Expected share of each cell, dims (sample, row, cell).
    precision
        α of the Dirichlet-multinomial, dims (sample, row).
    """

    cells: Floats
    precision: Floats


def expected_shares(parameters: Parameters, *, arrays: ElectionArrays, samples: np.ndarray) -> Floats:
    """Shares each row is expected to find, leans included; dims (sample, row, party)."""
    rows = arrays.rows
    seen = rows.national_weight @ (parameters.walk[samples] + parameters.lean[samples])
    leans = parameters.terms[samples][:, arrays.leans.terms_of_row].sum(axis=2)
    seen += leans[:, rows.row_of_part]
    own = support_at_knots(parameters.region[samples], country=arrays.country)
    own = between_knots(own, weight=rows.region_weight)
    share = np.exp(seen)[:, :, None, :] * own
    share /= share.sum(axis=-1, keepdims=True)
    parts = np.einsum("nr,snrp->snp", rows.region_mix, share)
    out = np.zeros((len(samples), len(rows.respondents), parts.shape[2]))
    np.add.at(out.transpose(1, 0, 2), rows.row_of_part, parts.transpose(1, 0, 2))
    return out


def expected_answers(
    parameters: Parameters, *, arrays: ElectionArrays, samples: np.ndarray
) -> ExpectedAnswers:
    """What the model expects each row to print, and how surely."""
    rows = arrays.rows
    shares = expected_shares(parameters, arrays=arrays, samples=samples)
    design_effect = row_design_effect(
        kappa=parameters.kappa[samples],
        rho=parameters.rho[samples],
        house_of_row=rows.house_of_row,
        poll_respondents=rows.poll_respondents,
        weighting_known=rows.weighting_known,
    )
    return ExpectedAnswers(
        cells=cell_shares(shares, partition=rows.partition, used=rows.used),
        precision=answer_precision(
            respondents=rows.respondents, design_effect=design_effect, larger=np.maximum
        ),
    )


def row_log_likelihood(parameters: Parameters, *, arrays: ElectionArrays, samples: np.ndarray) -> Floats:
    """Log density of each row's figures, without their coefficient; dims (sample, row)."""
    expected = expected_answers(parameters, arrays=arrays, samples=samples)
    return answers_log_likelihood(arrays.rows, expected=expected)


def answers_log_likelihood(rows: RowArrays, *, expected: ExpectedAnswers) -> Floats:
    """Log density of each row's figures given what was expected; dims (sample, row)."""
    cells, precision = expected.cells, expected.precision
    density = answers_log_density(
        rows.answers, cells=cells, precision=precision, kept=kept_cells(rows), log_gamma=gammaln
    )
    if len(rows.small_row):
        small = small_counts(rows)
        row, cell = rows.small_row, rows.small_cell
        inside = small_cells_log_density(
            small.counts,
            log_count_weight=small.log_count_weight,
            weight=precision[:, row] * cells[:, row, cell],
            precision=precision[:, row],
            respondents=rows.respondents[row],
            log_gamma=gammaln,
            exp=np.exp,
            log=np.log,
        )
        np.add.at(density.T, row, inside.T)
    return density


def pareto_k_by_poll(parameters: Parameters, *, arrays: ElectionArrays, chains: int) -> dict[str, float]:
    """Pareto-k of each poll: above .7 the fit leans on that poll so hard that it deserves a look.

    References
    ----------
    Vehtari, Simpson, Gelman, Yao & Gabry (2024), "Pareto smoothed importance sampling", JMLR 25(72):1–58.
    """
    total = len(parameters.kappa)
    samples = np.arange(0, total, max(1, total // DRAWS_FOR_PARETO_K))
    samples = samples[: len(samples) // chains * chains]
    by_row = np.concatenate(
        [
            row_log_likelihood(parameters, arrays=arrays, samples=part)
            for part in np.array_split(samples, max(1, len(samples) // DRAWS_AT_ONCE))
        ]
    )
    by_poll = by_row @ np.eye(len(arrays.rows.polls))[arrays.rows.poll_of_row]
    likelihood = xr.Dataset(
        {"answers": ((CHAIN, DRAW, POLL), by_poll.reshape(chains, -1, by_poll.shape[1]))},
        coords={POLL: list(arrays.rows.polls)},
    )
    tree = xr.DataTree.from_dict({"posterior": likelihood, "log_likelihood": likelihood})
    with warnings.catch_warnings():
        # The warning speaks of leaving polls out; here k itself is the result, and each poll's is reported.
        warnings.filterwarnings("ignore", message="Estimated shape parameter of Pareto distribution")
        k = az.loo(tree, pointwise=True, var_name="answers", reff=1.0).pareto_k
    return dict(zip(arrays.rows.polls, k.to_numpy().tolist(), strict=True))
