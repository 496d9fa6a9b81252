"""From parameters to what is published: support by day and region, house leans, design effects."""

from __future__ import annotations

from datetime import date, timedelta

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.estimate.knots import knot_weights
from aggregator.estimate.parameters import Parameters
from models.arrays import CountryArrays, ElectionArrays, Floats
from models.dimensions import CHAIN, DATE, DRAW, HOUSE, PARTY, REGION
from models.region_support import own_support

# Turnout: how far a region's share of the votes may move between two elections, log units (common practice).
TURNOUT_LOG_SD = 0.04
# The regional part of the shared lean, as a part of the national one: an assumption, small beside it.
REGION_LEAN_PART = 0.4
DAYS_BETWEEN_DATES = 7


def series_dates(*, first_fieldwork: date, run_date: date) -> pd.DatetimeIndex:
    """Weekly days from the first fieldwork to the day of the run, which is the last."""
    weeks = max((run_date - first_fieldwork).days, 0) // DAYS_BETWEEN_DATES
    return pd.DatetimeIndex([run_date - timedelta(days=DAYS_BETWEEN_DATES * k) for k in range(weeks, -1, -1)])


def summarise_support(
    parameters: Parameters,
    *,
    arrays: ElectionArrays,
    chains: int,
    dates: pd.DatetimeIndex,
    polling_day: date,
    shared_lean: float,
    rng: np.random.Generator,
) -> xr.Dataset:
    """Published quantities per draw.

    Turnout weights and the regional part of the shared lean are drawn here: no poll can teach them.

    Parameters
    ----------
    parameters
        Draws of the parameters, sample = chain · draws + draw.
    chains
        Number of chains the samples come from.
    dates
        Days of the series; the last one is the day of the run.
    polling_day
        Day of the last knot.
    shared_lean
        Scale of the shared lean, log units × √p; zero where the lean is off.
    rng
        For turnout and regional leans.

    Returns
    -------
    ``support`` (chain, draw, date, region, party), ``support_polling_day``, ``national_support``,
    ``turnout_weight``, ``house_lean``, ``design_effect`` and the scales that shelf life needs; shares 0–1.
    """
    country = arrays.country
    zero = polling_day.toordinal() - arrays.knots.national_day[-1]
    days = np.array([d.toordinal() for d in dates], dtype=float) - zero
    moments = np.append(days, arrays.knots.national_day[-1])
    turnout = _draw_turnout(len(parameters.kappa), country.turnout, rng)
    region_lean = _draw_region_lean(len(parameters.kappa), arrays, shared_lean, rng)
    support = _support(parameters, arrays=arrays, moments=moments, region_lean=region_lean)
    # Summed party by party: over a short dim that is faster than a batched matrix product.
    national = np.einsum("sr,sdrp->sdp", turnout.astype(np.float32), support)
    house_lean = _house_lean(parameters, national[:, -2].astype(float))
    usual = _usual_sample(arrays)
    variables = {
        "support": ((DATE, REGION, PARTY), support[:, :-1]),
        "support_polling_day": ((REGION, PARTY), support[:, -1]),
        "national_support": ((DATE, PARTY), national[:, :-1]),
        "national_support_polling_day": ((PARTY,), national[:, -1]),
        "turnout_weight": ((REGION,), turnout),
        "house_lean": ((HOUSE, PARTY), house_lean),
        "design_effect": ((HOUSE,), parameters.kappa + (usual - 1) * parameters.rho),
        "kappa": ((HOUSE,), parameters.kappa),
        "rho": ((HOUSE,), parameters.rho),
        "drift_sd_log": ((PARTY,), parameters.drift),
        "house_sd_log": ((PARTY,), parameters.house_scale),
        "region_drift_ratio": ((), parameters.region_ratio),
    }
    data = {
        name: ((CHAIN, DRAW, *dims), values.reshape(chains, -1, *values.shape[1:]))
        for name, (dims, values) in variables.items()
    }
    data["shared_lean_sd_log"] = ((PARTY,), shared_lean / np.sqrt(country.reference_share))
    data["usual_sample"] = ((HOUSE,), usual)
    data["poll_count"] = ((HOUSE,), np.bincount(arrays.rows.house_of_row, minlength=len(usual)))
    return xr.Dataset(
        data,
        coords={
            PARTY: list(country.parties),
            REGION: list(country.regions),
            HOUSE: list(arrays.rows.houses),
            DATE: dates.to_numpy(),
        },
    )


def _support(
    parameters: Parameters, *, arrays: ElectionArrays, moments: Floats, region_lean: Floats
) -> Floats:
    """True support at each moment, dims (sample, moment, region, party), float32."""
    knots, country = arrays.knots, arrays.country
    national = knot_weights(knots.national_day, first_day=moments, last_day=moments)
    regional = knot_weights(knots.region_day, first_day=moments, last_day=moments)
    lean = np.exp(region_lean)
    out = np.empty((len(parameters.walk), len(moments), *country.standing.shape), dtype=np.float32)
    # In slices, so that no array of double precision holds all draws, dates and regions at once.
    for part in np.array_split(np.arange(len(out)), max(1, len(out) // 250)):
        share = region_support(parameters.region[part], country=country, weight=regional)
        share *= np.exp(national @ parameters.walk[part])[:, :, None, :] * lean[part][:, None]
        out[part] = share / share.sum(axis=-1, keepdims=True)
    return out


def region_support(region: Floats, *, country: CountryArrays, weight: Floats) -> Floats:
    """Each region's own support E at some moments, zero for absent parties.

    Parameters
    ----------
    region
        Log deviations at the regional knots, dims (sample, knot, region, party).
    weight
        Weights of the knots, dims (moment, knot).

    Returns
    -------
    dims (sample, moment, region, party).
    """
    own = own_support(
        region,
        start_share=country.standing * np.exp(country.start_log_share),
        turnout=country.turnout,
        exp=np.exp,
    )
    flat = own.reshape(*own.shape[:2], -1)
    return (weight @ flat).reshape(len(own), len(weight), *country.standing.shape)


def _draw_turnout(samples: int, turnout: Floats, rng: np.random.Generator) -> Floats:
    weight = turnout * np.exp(TURNOUT_LOG_SD * rng.normal(size=(samples, len(turnout))))
    return weight / weight.sum(axis=1, keepdims=True)


def _draw_region_lean(
    samples: int, arrays: ElectionArrays, shared_lean: float, rng: np.random.Generator
) -> Floats:
    """Regional part of the shared lean, turnout-weighted mean zero; dims (sample, region, party)."""
    country = arrays.country
    size = REGION_LEAN_PART * shared_lean / np.sqrt(country.reference_share)
    lean = rng.normal(size=(samples, *country.standing.shape)) * size
    return lean - np.einsum("r,srp->sp", country.turnout, lean)[:, None, :]


def _house_lean(parameters: Parameters, national: Floats) -> Floats:
    """What each house would report at today's national support less the mean over houses; share units."""
    reported = national[:, None, :] * np.exp(parameters.house)
    reported /= reported.sum(axis=-1, keepdims=True)
    return reported - reported.mean(axis=1, keepdims=True)


def _usual_sample(arrays: ElectionArrays) -> Floats:
    """Median size of each house's polls, dims (house)."""
    rows = arrays.rows
    return np.array(
        [np.median(rows.poll_respondents[rows.house_of_row == h]) for h in range(len(rows.houses))]
    )
