"""The election model as a textbook would write it for ``pm.sample()``: the reference of the fit's benchmark.

The same prior, the same likelihood, the same published quantities, in the plainest idiom: every walk a
cumulative sum of standard normals times its scale, every effect a standard normal times its scale, the
likelihood as potentials. Nothing here steers the sampler.
"""

from __future__ import annotations

import numpy as np
import pymc as pm
import pytensor.tensor as pt
import xarray as xr
from pymc.distributions.dist_math import betaln

from aggregator.estimate.parameters import Parameters
from models.arrays import ElectionArrays
from models.poll_answers import SMALLEST_EXCESS, kept_cells, small_counts
from models.priors import SCALE_SHARE, Priors

NATURAL = (
    "drift",
    "house_scale",
    "lean_scale",
    "region_ratio",
    "ramp",
    "walk",
    "region",
    "lean",
    "terms",
    "kappa",
    "rho",
)


def build_textbook_model(arrays: ElectionArrays, *, priors: Priors) -> pm.Model:
    """The model of ``models.election_model`` with its shared lean; natural parameters are deterministics."""
    country, knots, rows, leans = arrays.country, arrays.knots, arrays.rows, arrays.leans
    P, R, H = len(country.parties), len(country.regions), len(rows.houses)
    K, L = len(knots.national_day), len(knots.region_day)
    with pm.Model() as model:
        # Scales
        size = np.sqrt(SCALE_SHARE / country.reference_share)
        drift_log = pm.Normal("drift_log", priors.drift_log_median, priors.drift_log_sd)
        drift_own = pm.Normal("drift_own", 0, 1, shape=P)
        drift = pm.Deterministic("drift", pt.exp(drift_log + priors.party_spread * drift_own) * size)
        house_log = pm.Normal("house_scale_log", priors.house_log_median, priors.house_log_sd)
        house_own = pm.Normal("house_scale_own", 0, 1, shape=P)
        house_scale = pm.Deterministic(
            "house_scale", pt.exp(house_log + priors.party_spread * house_own) * size
        )

        # The error all polls share, turning from the last result to polling day
        lean_scale = pm.Deterministic(
            "lean_scale", pt.sqrt(country.lean_size**2 / country.reference_share + house_scale**2 / H)
        )
        ends = pm.Normal("shared_lean_ends", 0, 1, shape=(2, P))

        def lean_at(clock: np.ndarray) -> pt.TensorVariable:
            angle = clock * np.arccos(priors.lean_correlation)
            return lean_scale * (np.cos(angle)[:, None] * ends[0] + np.sin(angle)[:, None] * ends[1])

        lean = pm.Deterministic("lean", lean_at(knots.lean_clock))

        # Starts of parties without a record, nationally as polled and by region
        free = country.free_party
        start, region_start = pt.zeros(P), pt.zeros((R, P))
        if len(free):
            own = pm.Normal("free_baseline_own", 0, 1, shape=len(free))
            true_start = priors.free_log_sd * own - lean_at(np.array([knots.lean_reference]))[0, free]
            start = pt.set_subtensor(start[free], true_start)
            if R > 1:
                own = pm.Normal("free_region_baseline_own", 0, 1, shape=(R, len(free)))
                region_start = pt.set_subtensor(region_start[:, free], priors.free_region_log_sd * own)

        # Opinion time: weeks, those that jolts add, and a ramp towards polling day
        ramp = pm.Normal("ramp_log_height", 0, priors.ramp_log_sd) if knots.has_ramp else pt.zeros(())
        pm.Deterministic("ramp", ramp)
        national_time = knots.national_step * pt.exp(ramp * knots.national_ramp) + knots.national_jolt
        region_time = knots.region_step * pt.exp(ramp * knots.region_ramp) + knots.region_jolt

        # National walk
        steps = pm.Normal("national_steps", 0, 1, shape=(K - 1, P))
        walk = pt.cumsum(pt.sqrt(national_time)[:, None] * steps, axis=0) * drift
        walk = pm.Deterministic("walk", start + pt.concatenate([pt.zeros((1, P)), walk]))

        # Regional walks, their turnout-weighted mean zero
        region = pt.zeros((L, R, P))
        ratio = pt.ones(())
        if R > 1:
            odds = priors.region_ratio_median / (priors.region_ratio_most - priors.region_ratio_median)
            logit = np.log(odds) + priors.region_ratio_spread * pm.Normal("region_ratio_own", 0, 1)
            ratio = priors.region_ratio_most * pm.math.sigmoid(logit)
            steps = pm.Normal("region_steps", 0, 1, shape=(L - 1, R, P))
            steps = steps - (country.turnout[:, None] * steps).sum(axis=1, keepdims=True)
            paths = pt.cumsum(pt.sqrt(region_time)[:, None, None] * steps, axis=0) * drift * ratio
            region = pt.concatenate([pt.zeros((1, R, P)), paths])
        pm.Deterministic("region_ratio", ratio)
        region = pm.Deterministic("region", region + region_start)

        # House effects sum to zero over houses, eras within their house, modes over houses by their share
        effects = pm.Normal("house_effects", 0, 1, shape=(H, P))
        parts = [effects - effects.mean(axis=0)]
        if len(leans.eras):
            effects = pm.Normal("era_effects", 0, 1, shape=(len(leans.eras), P))
            same_house = leans.era_house[:, None] == leans.era_house
            within = same_house / same_house.sum(axis=1, keepdims=True)
            parts.append(priors.era_part * (effects - pt.dot(within, effects)))
        if len(leans.modes):
            effects = pm.Normal("mode_effects", 0, 1, shape=(len(leans.modes), P))
            parts.append(priors.mode_part * (effects - pt.dot(leans.mode_share, effects)))
        if len(leans.populations):
            effects = pm.Normal("population_effects", 0, 1, shape=(len(leans.populations), P))
            parts.append(priors.population_part * effects)
        if len(leans.formations):
            effects = pm.Normal("formation_effects", 0, 1, shape=(len(leans.formations), P))
            parts.append(priors.formation_part * effects)
        terms = pm.Deterministic("terms", house_scale * pt.concatenate([*parts, pt.zeros((1, P))]))
        row_lean = terms[leans.terms_of_row].sum(axis=1)

        # Design effects
        loss = pm.Normal(
            "weighting_loss_log", priors.weighting_loss_log_median, priors.weighting_loss_log_sd
        ) + priors.weighting_loss_spread * pm.Normal("weighting_loss_own", 0, 1, shape=H)
        floor = pm.Normal(
            "error_floor_log", priors.error_floor_log_median, priors.error_floor_log_sd
        ) + priors.error_floor_spread * pm.Normal("error_floor_own", 0, 1, shape=H)
        kappa = pm.Deterministic("kappa", 1 + pt.exp(loss))
        rho = pm.Deterministic("rho", pt.exp(floor))

        # Expected shares: log support moves in straight lines nationally, support itself by region
        seen = pt.dot(rows.national_weight, walk + lean) + row_lean[rows.row_of_part]
        # Regional swings leave a region's sum at one and a party's national sum as it was at the start
        start_share = country.standing * np.exp(country.start_log_share)
        before = (country.turnout[:, None] * start_share / start_share.sum(axis=1, keepdims=True)).sum(axis=0)
        own = start_share * pt.exp(region)
        for _ in range(2):
            own = own / own.sum(axis=2, keepdims=True)
            own = own * (before / (country.turnout[:, None] * own).sum(axis=1))[:, None, :]
        own_at_knots = own.reshape((L, R * P))
        own = pt.dot(rows.region_weight, own_at_knots).reshape((-1, R, P))
        support = pt.exp(seen)[:, None, :] * own
        support = support / support.sum(axis=2, keepdims=True)
        part_of_row = (np.arange(len(rows.respondents))[:, None] == rows.row_of_part).astype(float)
        expected = pt.dot(part_of_row, (rows.region_mix[:, :, None] * support).sum(axis=1))
        cells = (rows.partition * expected[:, None, :]).sum(axis=2)
        cells = cells * rows.used / (cells * rows.used).sum(axis=1, keepdims=True)

        # Published figures
        known = rows.weighting_known
        deff = (
            1
            + (kappa[rows.house_of_row] - 1) * (1 - known)
            + (rows.poll_respondents - 1) * rho[rows.house_of_row]
        )
        n = rows.respondents
        precision = pt.maximum(n - deff, SMALLEST_EXCESS * n) / (deff - 1)
        i, c = np.nonzero(kept_cells(rows))
        weight, answers = precision[i] * cells[i, c], rows.answers[i, c]
        row_sum = (np.arange(len(n))[:, None] == i).astype(float)
        total, kept_answers = pt.dot(row_sum, weight), row_sum @ answers
        single = pt.dot(row_sum, pt.gammaln(answers + weight) - pt.gammaln(weight))
        pm.Potential("answers", pt.gammaln(total) - pt.gammaln(kept_answers + total) + single)
        if len(rows.small_row):
            small = small_counts(rows)
            y, i, c = small.counts, rows.small_row, rows.small_cell
            a = (precision[i] * cells[i, c])[:, None]
            b = precision[i][:, None] - a
            terms = small.log_count_weight + betaln(y + a, n[i][:, None] - y + b) - betaln(a, b)
            pm.Potential("small_answers", pt.logsumexp(terms, axis=1))

        # Regions that have been counted, as a sample of people without any lean
        counted = arrays.counted
        if counted is not None:
            own = pt.dot(counted.region_weight, own_at_knots).reshape((-1, R, P))
            true = (
                pt.exp(pt.dot(counted.national_weight, walk))
                * own[np.arange(len(counted.region)), counted.region]
            )
            log_share = pt.log(pt.maximum(true / true.sum(axis=1, keepdims=True), 1e-12))
            pm.Potential("counts", counted.people * (counted.share * log_share).sum(axis=1))
    return model


def natural_parameters(posterior: xr.Dataset) -> Parameters:
    """The textbook model's draws as what the output step reads, sample = chain · draws + draw."""
    return Parameters(
        **{name: posterior[name].to_numpy().reshape(-1, *posterior[name].shape[2:]) for name in NATURAL}
    )
