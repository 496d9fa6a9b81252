"""From parameters to what is published: support by day and region, house leans, design effects."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.estimate.beside_the_polls import draw_region_lean, draw_turnout
from aggregator.estimate.house_leans import era_labels, summarise_leans
from aggregator.estimate.knots import knot_weights
from aggregator.estimate.opinion_clock import clock_days, opinion_clock
from aggregator.estimate.parameters import Parameters
from models.arrays import CountryArrays, ElectionArrays, Floats
from models.dimensions import CHAIN, DATE, DAY, DRAW, ERA, FORMATION, HOUSE, MODE, PARTY, POPULATION, REGION
from models.priors import Priors
from models.region_support import own_support

DAYS_BETWEEN_DATES = 7


def series_dates(*, first_fieldwork: date, run_date: date) -> pd.DatetimeIndex:
    """Weekly days from the first fieldwork to the day of the run, which is the last."""
    weeks = max((run_date - first_fieldwork).days, 0) // DAYS_BETWEEN_DATES
    return pd.DatetimeIndex([run_date - timedelta(days=DAYS_BETWEEN_DATES * k) for k in range(weeks, -1, -1)])


@dataclass(frozen=True)
class Calendar:
    """The days a release speaks of.

    Attributes
    ----------
    dates
        Days of the series; the last one is the day of the run.
    voting
        Polling day of each region, in the order of the arrays.
    jolts
        Weeks of opinion time that each jolt adds on its day.
    """

    dates: pd.DatetimeIndex
    voting: tuple[date, ...]
    jolts: dict[date, float]

    @property
    def last_voting(self) -> date:
        """The day of the last knot."""
        return max(self.voting)


def summarise_support(
    parameters: Parameters,
    *,
    arrays: ElectionArrays,
    eras: pd.DataFrame,
    chains: int,
    calendar: Calendar,
    shared_lean: bool,
    priors: Priors,
    rng: np.random.Generator,
) -> xr.Dataset:
    """Published quantities per draw.

    Turnout weights and the regional part of the shared lean are drawn here: no poll can teach them. A region
    stops moving on its polling day; one that has been counted has its result from that day on.

    Parameters
    ----------
    parameters
        Draws of the parameters, sample = chain · draws + draw.
    eras
        From :func:`aggregator.estimate.lean_terms_of_rows.list_eras`.
    chains
        Number of chains the samples come from.
    shared_lean
        Whether polls share an error.
    rng
        For regional leans, then turnout.

    Returns
    -------
    ``support`` (chain, draw, date, region, party), ``support_polling_day``, ``national_support``,
    ``turnout_weight``, ``house_lean``, ``era_lean``, ``design_effect``, ``opinion_clock`` (chain, draw, day;
    weeks), leans of modes, populations and formations where the register has them, and the scales that shelf
    life needs; shares 0–1.
    """
    country = arrays.country
    samples = len(parameters.kappa)
    size = country.lean_size if shared_lean else np.zeros_like(country.lean_size)
    region_lean = draw_region_lean(samples, country=country, lean_size=size, priors=priors, rng=rng)
    support = support_of_regions(parameters, arrays=arrays, calendar=calendar, region_lean=region_lean)
    turnout = draw_turnout(support[:, -1].astype(float), turnout=country.turnout, rng=rng)
    # Summed party by party: over a short dim that is faster than a batched matrix product.
    national = np.einsum("sr,sdrp->sdp", turnout.astype(np.float32), support)
    usual = _usual_sample(arrays)
    days = clock_days(calendar.dates, last_voting=calendar.last_voting)
    leans, fixed = summarise_leans(
        parameters, arrays=arrays, eras=eras, national=national[:, -2].astype(float), priors=priors
    )
    variables = {
        "support": ((DATE, REGION, PARTY), support[:, :-1]),
        "support_polling_day": ((REGION, PARTY), support[:, -1]),
        "national_support": ((DATE, PARTY), national[:, :-1]),
        "national_support_polling_day": ((PARTY,), national[:, -1]),
        "turnout_weight": ((REGION,), turnout),
        "design_effect": ((HOUSE,), parameters.kappa + (usual - 1) * parameters.rho),
        "kappa": ((HOUSE,), parameters.kappa),
        "rho": ((HOUSE,), parameters.rho),
        "drift_sd_log": ((PARTY,), parameters.drift),
        "house_sd_log": ((PARTY,), parameters.house_scale),
        "region_drift_ratio": ((), parameters.region_ratio),
        "opinion_clock": (
            (DAY,),
            opinion_clock(
                parameters.ramp,
                knots=arrays.knots,
                jolts=calendar.jolts,
                days=days,
                last_voting=calendar.last_voting,
            ),
        ),
        **leans,
    }
    if arrays.knots.has_ramp:
        variables["ramp_log_height"] = ((), parameters.ramp)
    data = {
        name: ((CHAIN, DRAW, *dims), values.reshape(chains, -1, *values.shape[1:]))
        for name, (dims, values) in variables.items()
    }
    data["shared_lean_sd_log"] = ((PARTY,), size / np.sqrt(country.reference_share))
    data["usual_sample"] = ((HOUSE,), usual)
    data["poll_count"] = ((HOUSE,), _poll_count(arrays))
    kinds = {MODE: arrays.leans.modes, POPULATION: arrays.leans.populations}
    kinds[FORMATION] = arrays.leans.formations
    return xr.Dataset(
        data | {name: value for name, value in fixed.items() if not name.startswith("era_")},
        coords={
            **{name: value for name, value in fixed.items() if name.startswith("era_")},
            PARTY: list(country.parties),
            REGION: list(country.regions),
            HOUSE: list(arrays.rows.houses),
            ERA: era_labels(eras),
            DATE: calendar.dates.to_numpy(),
            DAY: days.to_numpy(),
            **{kind: list(labels) for kind, labels in kinds.items() if labels},
        },
    )


def support_of_regions(
    parameters: Parameters, *, arrays: ElectionArrays, calendar: Calendar, region_lean: Floats
) -> Floats:
    """True support on each date, polling day last, dims (sample, moment, region, party), float32."""
    knots, country = arrays.knots, arrays.country
    zero = calendar.last_voting.toordinal() - knots.national_day[-1]
    voting = np.array([day.toordinal() for day in calendar.voting], dtype=float) - zero
    days = np.array([d.toordinal() for d in calendar.dates], dtype=float) - zero
    moments = np.append(days, knots.national_day[-1])
    lean = np.exp(region_lean)
    out = np.empty((len(parameters.walk), len(moments), *country.standing.shape), dtype=np.float32)
    phases = []
    for day in np.unique(voting):
        at = np.minimum(moments, day)
        national, regional = (
            knot_weights(knot_day, first_day=at, last_day=at)
            for knot_day in (knots.national_day, knots.region_day)
        )
        phases.append((np.flatnonzero(voting == day), national, regional))
    # In slices, so that no array of double precision holds all draws, dates and regions at once.
    for part in np.array_split(np.arange(len(out)), max(1, len(out) // 250)):
        own = support_at_knots(parameters.region[part], country=country)
        for regions, national, regional in phases:
            share = between_knots(own[:, :, regions], weight=regional)
            share *= np.exp(national @ parameters.walk[part])[:, :, None, :] * lean[part][:, None, regions]
            out[np.ix_(part, np.arange(len(moments)), regions)] = share / share.sum(axis=-1, keepdims=True)
    if arrays.counted is not None:
        for region, share in zip(arrays.counted.region, arrays.counted.share, strict=True):
            out[:, moments >= voting[region], region] = share
    return out


def support_at_knots(region: Floats, *, country: CountryArrays) -> Floats:
    """Each region's own support E at the regional knots, zero for absent parties.

    Parameters
    ----------
    region
        Log deviations at the knots, dims (sample, knot, region, party).

    Returns
    -------
    dims (sample, knot, region, party).
    """
    return own_support(
        region,
        start_share=country.standing * np.exp(country.start_log_share),
        turnout=country.turnout,
        exp=np.exp,
    )


def between_knots(own: Floats, *, weight: Floats) -> Floats:
    """Own support at some moments, dims (sample, moment, region, party).

    Parameters
    ----------
    own
        At the regional knots, dims (sample, knot, region, party).
    weight
        Weights of the knots, dims (moment, knot).
    """
    flat = own.reshape(*own.shape[:2], -1)
    return (weight @ flat).reshape(len(own), len(weight), *own.shape[2:])


def _usual_sample(arrays: ElectionArrays) -> Floats:
    """Median size of each house's polls, dims (house)."""
    rows = arrays.rows
    return np.array(
        [np.median(rows.poll_respondents[rows.house_of_row == h]) for h in range(len(rows.houses))]
    )


def _poll_count(arrays: ElectionArrays) -> np.ndarray:
    """Number of polls of each house, dims (house)."""
    rows = arrays.rows
    pairs = np.unique(np.stack([rows.house_of_row, rows.poll_of_row]), axis=1)
    return np.bincount(pairs[0], minlength=len(rows.houses))
