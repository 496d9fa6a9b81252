"""Draws to numbers: quantiles, means and Monte Carlo errors, for many quantities at once."""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from typing import Any

import numpy as np
import xarray as xr
from arviz_stats.base import array_stats
from numpy.typing import NDArray

from models.dimensions import CHAIN, DRAW

QUANTILES = {"q05": 0.05, "q25": 0.25, "q50": 0.50, "q75": 0.75, "q95": 0.95}


def stack_samples(draws: xr.DataArray, *, dims: Sequence[Hashable]) -> NDArray[Any]:
    """Array with the given dims first and all draws of all chains, side by side in memory, last.

    Parameters
    ----------
    draws
        dims (chain, draw, …), any order.
    dims
        The other dims, in the order wanted.
    """
    ordered = draws.transpose(*dims, CHAIN, DRAW).values
    return np.ascontiguousarray(ordered.reshape(*ordered.shape[: len(dims)], -1))


def summarise_samples(samples: NDArray[Any], *, whole: bool = False) -> dict[str, NDArray[np.float64]]:
    """Mean, standard deviation and the published quantiles over the last axis.

    Parameters
    ----------
    samples
        Shape (…, sample).
    whole
        Whether the quantity is a count: its quantiles are then values it can take (the inverse of the
        empirical distribution) and not points between them.

    Returns
    -------
    dict
        Keys ``mean``, ``sd``, ``q05``, ``q25``, ``q50``, ``q75``, ``q95``; each of shape (…).
    """
    levels = np.quantile(
        samples, list(QUANTILES.values()), axis=-1, method="inverted_cdf" if whole else "linear"
    )
    summary = {
        "mean": samples.mean(axis=-1, dtype=np.float64),
        "sd": samples.std(axis=-1, dtype=np.float64),
    }
    summary |= {name: levels[place].astype(np.float64) for place, name in enumerate(QUANTILES)}
    return summary


def monte_carlo_error(indicator: NDArray[np.float64]) -> NDArray[np.float64]:
    """Estimate the standard error of a mean over correlated draws, by effective sample size.

    Where all draws agree there is no spread to measure; the error is then that of the smallest chance the
    number of draws can show.

    Parameters
    ----------
    indicator
        Shape (chain, draw, …), values 0 to 1.

    Returns
    -------
    numpy.ndarray
        Shape (…).

    References
    ----------
    .. [1] Vehtari, A., et al. (2021). Rank-normalization, folding, and localization: an improved R-hat.
       Bayesian Analysis 16(2), 667-718. https://doi.org/10.1214/20-BA1221
    """
    samples = indicator.shape[0] * indicator.shape[1]
    least = (np.clip(indicator.mean(axis=(0, 1)) * samples, 0.5, samples - 0.5)) / samples
    floor = np.sqrt(least * (1.0 - least) / samples)
    varies = np.ptp(indicator, axis=(0, 1)) > 0
    error = np.array(floor)
    if varies.any() and indicator.shape[1] >= 4:
        measured = array_stats.mcse(indicator[:, :, varies], chain_axis=0, draw_axis=1, method="mean")
        error[varies] = np.where(np.isfinite(measured), measured, floor[varies])
    return error
