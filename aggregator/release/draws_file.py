"""The run's draws as one file with named groups and dims."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import xarray as xr

from models.dimensions import CHAIN, DATE, DAY, DRAW

MOST_DRAWS_OVER_TIME = 1_000
"""Draws kept of everything that runs over time; the rest is kept in full. A season of weekly releases must
fit on a newsroom's disk, and a thousand draws give a quantile's position within about 1.4 points of level."""

SEAT_BY_SEAT = ("won", "seat_votes")
"""Draws by seat and party are left out: ten times the size of all else together, and counted again in seconds
from the inputs and the seed. What each seat comes to on average is kept."""


def build_draws_tree(draws: xr.Dataset, *, seats: xr.Dataset | None) -> xr.DataTree:
    """Arrange draws in groups: ``posterior``, ``seats`` in full, ``…_over_time`` thinned.

    Parameters
    ----------
    draws, seats
        Draws of support and of seats (None where nothing is counted).

    Returns
    -------
    xarray.DataTree
        Groups ``posterior`` and ``posterior_over_time``, and with seats ``seats`` and ``seats_over_time``;
        shares as float32.
    """
    groups = {}
    for name, dataset in (("posterior", draws), ("seats", seats)):
        if dataset is None:
            continue
        dataset = dataset.drop_vars(SEAT_BY_SEAT, errors="ignore")
        over_time = [key for key, array in dataset.data_vars.items() if {DATE, DAY} & set(array.dims)]
        groups[name] = _narrow(dataset.drop_vars(over_time).drop_dims([DATE, DAY], errors="ignore"))
        groups[f"{name}_over_time"] = _narrow(_thin(dataset[over_time]))
    tree = xr.DataTree.from_dict(groups)
    tree.attrs = dict(draws.attrs)
    return tree


def write_draws(path: Path, *, draws: xr.Dataset, seats: xr.Dataset | None) -> None:
    """Write the draws as NetCDF."""
    path.parent.mkdir(parents=True, exist_ok=True)
    build_draws_tree(draws, seats=seats).to_netcdf(path, engine="h5netcdf")


def _thin(dataset: xr.Dataset) -> xr.Dataset:
    """Every k-th draw of every chain, at most ``MOST_DRAWS_OVER_TIME`` in all."""
    if DRAW not in dataset.dims:
        return dataset
    step = -(-dataset.sizes[CHAIN] * dataset.sizes[DRAW] // MOST_DRAWS_OVER_TIME)
    return dataset.isel({DRAW: slice(None, None, step)})


def _narrow(dataset: xr.Dataset) -> xr.Dataset:
    """Floating numbers as float32: draws carry no more precision than that."""
    return dataset.map(
        lambda array: array.astype(np.float32) if array.dtype == np.float64 else array, keep_attrs=True
    )
