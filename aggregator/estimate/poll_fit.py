"""How the model sees each poll: what it expected, how likely the figures are, which ones it leans on."""

from __future__ import annotations

import warnings

import arviz as az
import numpy as np
import xarray as xr
from scipy.special import gammaln

from aggregator.estimate.parameters import Parameters
from aggregator.estimate.support import region_support
from models.arrays import ElectionArrays, Floats
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


def expected_shares(parameters: Parameters, *, arrays: ElectionArrays, samples: np.ndarray) -> Floats:
    """Shares each row is expected to find, leans included; dims (sample, row, party)."""
    rows = arrays.rows
    seen = rows.national_weight @ (parameters.walk[samples] + parameters.lean[samples])
    leans = parameters.terms[samples][:, arrays.leans.terms_of_row].sum(axis=2)
    seen += leans[:, rows.row_of_part]
    own = region_support(parameters.region[samples], country=arrays.country, weight=rows.region_weight)
    share = np.exp(seen)[:, :, None, :] * own
    share /= share.sum(axis=-1, keepdims=True)
    parts = np.einsum("nr,snrp->snp", rows.region_mix, share)
    out = np.zeros((len(samples), len(rows.respondents), parts.shape[2]))
    np.add.at(out.transpose(1, 0, 2), rows.row_of_part, parts.transpose(1, 0, 2))
    return out


def row_log_likelihood(parameters: Parameters, *, arrays: ElectionArrays, samples: np.ndarray) -> Floats:
    """Log density of each row's figures, without their coefficient; dims (sample, row)."""
    rows = arrays.rows
    cells = cell_shares(
        expected_shares(parameters, arrays=arrays, samples=samples), partition=rows.partition, used=rows.used
    )
    precision = answer_precision(
        respondents=rows.respondents,
        design_effect=row_design_effect(
            kappa=parameters.kappa[samples],
            rho=parameters.rho[samples],
            house_of_row=rows.house_of_row,
            poll_respondents=rows.poll_respondents,
            weighting_known=rows.weighting_known,
        ),
        larger=np.maximum,
    )
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
