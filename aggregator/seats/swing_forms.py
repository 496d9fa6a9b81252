"""Other ways for a region's move to reach its seats, to hold beside the one in use.

In use are log-ratios with a slope: a region's odds move by the same factor in all its seats, a little more or
less where a party was strong. Beside it stand the same without a slope (each party's share changes in
proportion everywhere) and the same points added everywhere, which is uniform swing.

References
----------
Butler, D. and Stokes, D. (1969). Political Change in Britain. Macmillan (uniform and proportionate swing;
cited from memory).
"""

from __future__ import annotations

from dataclasses import replace
from enum import StrEnum

import numpy as np
import xarray as xr

from aggregator.seats.local_noise import LocalPriors
from aggregator.seats.local_swing import LocalStrength, region_starts
from aggregator.seats.rules import Float32Array
from models.dimensions import PARTY, SEAT

# Points taken away where a party had few would leave less than nothing: it keeps a tenth of its last share.
LEAST_PART = 0.1


class SwingForm(StrEnum):
    """How a region's move reaches its seats."""

    LOG_RATIO = "log-ratios, strongholds apart"
    PROPORTIONAL = "the same proportion everywhere"
    ADDITIVE = "the same points everywhere"


def priors_of_form(priors: LocalPriors, *, form: SwingForm) -> LocalPriors:
    """Give the priors of a form: only the one in use has a slope."""
    return priors if form is SwingForm.LOG_RATIO else replace(priors, slope_sd=0.0)


def add_points(local: LocalStrength, *, baseline: xr.Dataset, support: Float32Array) -> LocalStrength:
    """Move every seat by its region's points instead of its factor, the noise staying the same.

    Parameters
    ----------
    local
        Strengths drawn without slope.
    baseline
        Where the seats start.
    support
        Support of one day, dims (draw, region, party), in the baseline's order.
    """
    start = region_starts(baseline)
    log_share = baseline["log_share"].transpose(PARTY, SEAT).to_numpy()
    share = np.exp(log_share)
    share /= share.sum(axis=0)
    weight = baseline["weight"].to_numpy()
    regional = np.add.reduceat(weight * share, start[:-1], axis=1)
    region_of_seat = np.repeat(np.arange(start.size - 1), np.diff(start))
    points = support.transpose(0, 2, 1) - regional.astype(np.float32)
    moved = share.astype(np.float32) + points[:, :, region_of_seat]
    moved = np.maximum(moved, np.float32(LEAST_PART) * share.astype(np.float32))
    stands = share > 0
    factor = np.where(stands, moved / np.where(stands, np.exp(log_share), 1.0), 0.0)
    return replace(local, strength=(local.strength * factor).astype(np.float32))
