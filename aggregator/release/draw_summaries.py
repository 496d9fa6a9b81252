"""Draws to numbers: means, standard deviations and quantiles, for many quantities at once."""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from typing import Any

import numpy as np
import xarray as xr
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
    # Sorting is vectorised in numpy, and finding several quantiles in sorted values takes next to no time.
    ordered = np.sort(samples, axis=-1)
    levels = np.quantile(
        ordered, list(QUANTILES.values()), axis=-1, method="inverted_cdf" if whole else "linear"
    )
    summary = {
        "mean": samples.mean(axis=-1, dtype=np.float64),
        "sd": samples.std(axis=-1, dtype=np.float64),
    }
    summary |= {name: levels[place].astype(np.float64) for place, name in enumerate(QUANTILES)}
    return summary
