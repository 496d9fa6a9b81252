"""What no poll can teach, drawn beside the model: turnout, and the regions' parts of the shared lean."""

from __future__ import annotations

import numpy as np

from models.arrays import CountryArrays, Floats
from models.priors import Priors

# Turnout: how far a region's share of the votes may move between two elections, log units (common practice).
TURNOUT_LOG_SD = 0.04
# How far turnout may follow a party: log turnout per unit of its share, common to all regions (an
# assumption). A region where the party has ten points more then turns out two per cent more or less.
TURNOUT_TILT_SD = 0.2


def draw_turnout(support: Floats, *, turnout: Floats, rng: np.random.Generator) -> Floats:
    r"""Turnout weights, dims (sample, region), sum to one.

    .. math:: \log w_r = \log w_r^0 + \sum_p t_p (\theta_{rp} - \bar\theta_p) + e_r

    with the tilts t common to all regions: where a party's voters stay at home, they do so everywhere, and
    its strongholds weigh less.

    Parameters
    ----------
    support
        Support on polling day, dims (sample, region, party).
    turnout
        Weights of the last result, dims (region).
    rng
        For the tilts, then the regions' own part.
    """
    samples, regions, parties = support.shape
    away = support - np.einsum("r,srp->sp", turnout, support)[:, None, :]
    tilt = TURNOUT_TILT_SD * rng.normal(size=(samples, parties))
    log_weight = np.einsum("srp,sp->sr", away, tilt) + TURNOUT_LOG_SD * rng.normal(size=(samples, regions))
    weight = turnout * np.exp(log_weight)
    return weight / weight.sum(axis=1, keepdims=True)


def draw_region_lean(
    samples: int, *, country: CountryArrays, lean_size: Floats, priors: Priors, rng: np.random.Generator
) -> Floats:
    """Regional part of the shared lean, turnout-weighted mean zero; dims (sample, region, party).

    Parameters
    ----------
    lean_size
        Size c of the shared lean, dims (party), log units × √p; zero where the lean is off.
    """
    size = priors.region_lean_part * lean_size / np.sqrt(country.reference_share)
    lean = rng.normal(size=(samples, *country.standing.shape)) * size
    return lean - np.einsum("r,srp->sp", country.turnout, lean)[:, None, :]
