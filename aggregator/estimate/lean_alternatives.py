r"""What polling day would look like under other assumptions about the shared lean, without another fit.

Polls see the walk and the shared lean together, x = walk + lean, and say nothing of their parts. So the draws
of x stand under any assumption A about the lean, weighed by how likely A finds them against the run's own
assumption, p(x | A') / p(x | A); and under A' the lean is drawn anew given x. Given the scales both are
normal in two numbers per party, the lean's two ends (u, v):

.. math:: x_k - x_{k-1} = l\,(L_k - L_{k-1})(u, v) + N(0, \sigma^2 \tau_k)

so that weight and new lean are a regression on two coefficients with a standard normal prior. Where a
region has been counted the lean of its polling day was seen too, and stays as it is. The weights are
Pareto-smoothed; a shape above .7 says that the draws cannot reach that assumption and the model must be
fitted anew.

Without any lean the question is another one: what polls would show on polling day. That is x itself.

References
----------
Vehtari, Simpson, Gelman, Yao & Gabry (2024), "Pareto smoothed importance sampling", JMLR 25(72):1–58.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pandas as pd
import xarray as xr
from arviz_stats.base import array_stats

from aggregator.alternatives import Alternative
from aggregator.estimate.beside_the_polls import draw_region_lean, draw_turnout
from aggregator.estimate.fit import Fit, release_calendar
from aggregator.estimate.parameters import Parameters, root_of_time
from aggregator.estimate.support import Calendar, support_of_regions
from aggregator.inputs.desk_inputs import DeskInputs
from models.arrays import ElectionArrays, Floats
from models.dimensions import CHAIN, DRAW, PARTY, REGION
from models.free_baseline import is_free
from models.priors import Priors
from models.shared_lean import lean_loadings, lean_scale

CORRELATION = "correlation of the shared lean between elections"
SIZE = "size of the shared lean"
CORRELATIONS = (0.0, 1 / 3, 2 / 3)
SETTING_NAMES = {0.0: "0", 1 / 3: "1/3", 2 / 3: "2/3"}
# Draws that each alternative is worked out from.
DRAWS = 2000
# The lean of a day that was seen is known up to this part of its scale.
SEEN_PART = 1e-4
LARGEST_PARETO_K = 0.7


@dataclass(frozen=True)
class _Lean:
    """One assumption: the lean's size, dims (sample, party), and the correlation of its ends."""

    scale: Floats
    correlation: float


@dataclass(frozen=True)
class _Regression:
    """What draws of x say of (u, v): log evidence and posterior; dims (sample, party, …)."""

    log_evidence: Floats
    mean: Floats
    root: Floats


def lean_alternatives(inputs: DeskInputs, fit: Fit, *, rng: np.random.Generator) -> list[Alternative]:
    """Work out polling day under other correlations and sizes of the shared lean.

    Parameters
    ----------
    inputs
        The desk's checked files.
    fit
        The run's fit.
    rng
        For the leans drawn anew, turnout and regional leans.

    Returns
    -------
    One alternative per setting, seats still to be counted; none where the run has no shared lean.
    """
    if not inputs.contest.model.shared_lean:
        return []
    arrays, priors = fit.arrays, fit.priors
    chains = fit.draws.sizes[CHAIN]
    parameters = _thinned(fit.parameters, chains)
    calendar = replace(release_calendar(inputs), dates=pd.DatetimeIndex([]))
    used = _Lean(parameters.lean_scale, priors.lean_correlation)
    size = arrays.country.lean_size
    settings: list[tuple[str, str, _Lean, Floats]] = []
    for correlation in sorted({*CORRELATIONS, priors.lean_correlation}):
        setting = SETTING_NAMES.get(correlation, f"{correlation:.2g}")
        lean = replace(used, correlation=correlation)
        settings.append((CORRELATION, setting, lean, size))
    settings.append((SIZE, "in use", used, size))
    if inputs.past_errors is not None:
        plain = np.full_like(size, priors.shared_lean)
        settings.append((SIZE, "published record", _resized(plain, used, parameters, arrays), plain))
    *own_rngs, last_rng = rng.spawn(len(settings) + 1)
    alternatives = [
        _alternative(
            assumption,
            setting,
            fit=fit,
            parameters=parameters,
            calendar=calendar,
            leans=(used, lean),
            lean_size=lean_size,
            rng=own_rng,
        )
        for (assumption, setting, lean, lean_size), own_rng in zip(settings, own_rngs, strict=True)
    ]
    polled = replace(parameters, walk=parameters.walk + parameters.lean, lean=np.zeros_like(parameters.lean))
    draws = _polling_day(polled, fit=fit, calendar=calendar, lean_size=np.zeros_like(size), rng=last_rng)
    return [*alternatives, Alternative(SIZE, "none: what polls would show", False, draws, None, 0.0)]


def _thinned(parameters: Parameters, chains: int) -> Parameters:
    total = len(parameters.kappa)
    at = np.arange(0, total, max(1, total // DRAWS))
    at = at[: len(at) // chains * chains]
    return _taken(parameters, at)


def _taken(parameters: Parameters, at: np.ndarray) -> Parameters:
    return Parameters(**{name: value[at] for name, value in vars(parameters).items()})


def _resized(size: Floats, used: _Lean, parameters: Parameters, arrays: ElectionArrays) -> _Lean:
    scale = lean_scale(
        lean_size=size,
        reference_share=arrays.country.reference_share,
        house_scale=parameters.house_scale,
        house_count=len(arrays.rows.houses),
    )
    return replace(used, scale=scale)


def _alternative(
    assumption: str,
    setting: str,
    *,
    fit: Fit,
    parameters: Parameters,
    calendar: Calendar,
    leans: tuple[_Lean, _Lean],
    lean_size: Floats,
    rng: np.random.Generator,
) -> Alternative:
    used, lean = leans
    arrays, priors = fit.arrays, fit.priors
    if lean.scale is used.scale and lean.correlation == used.correlation:
        names = ["national_support_polling_day", "support_polling_day", "turnout_weight"]
        return Alternative(assumption, setting, True, fit.draws[names], None, 0.0)
    before = _regression(parameters, used, arrays=arrays, priors=priors)
    after = _regression(parameters, lean, arrays=arrays, priors=priors)
    log_weight = (after.log_evidence - before.log_evidence).sum(axis=1)
    # The library's function takes a log-likelihood and weighs by its inverse.
    smoothed, k = array_stats.psislw(-log_weight[None], axis=-1)
    pareto_k = float(np.max(k))
    if not pareto_k <= LARGEST_PARETO_K:
        return Alternative(assumption, setting, False, None, None, pareto_k)
    at = _resample(np.exp(smoothed[0]), rng)
    moved = _with_new_lean(_taken(parameters, at), lean, after, at, arrays=arrays, rng=rng)
    draws = _polling_day(moved, fit=fit, calendar=calendar, lean_size=lean_size, rng=rng)
    return Alternative(assumption, setting, False, draws, None, pareto_k)


def _polling_day(
    parameters: Parameters, *, fit: Fit, calendar: Calendar, lean_size: Floats, rng: np.random.Generator
) -> xr.Dataset:
    """Support and turnout on polling day; dims (chain, draw, …), one chain."""
    arrays = fit.arrays
    region_lean = draw_region_lean(
        len(parameters.kappa), country=arrays.country, lean_size=lean_size, priors=fit.priors, rng=rng
    )
    support = support_of_regions(parameters, arrays=arrays, calendar=calendar, region_lean=region_lean)[:, -1]
    turnout = draw_turnout(support.astype(float), turnout=arrays.country.turnout, rng=rng)
    national = np.einsum("sr,srp->sp", turnout.astype(np.float32), support)
    return xr.Dataset(
        {
            "national_support_polling_day": ((CHAIN, DRAW, PARTY), national[None]),
            "support_polling_day": ((CHAIN, DRAW, REGION, PARTY), support[None]),
            "turnout_weight": ((CHAIN, DRAW, REGION), turnout[None]),
        },
        coords={PARTY: fit.draws[PARTY], REGION: fit.draws[REGION]},
        attrs=fit.draws.attrs,
    )


def _regression(
    parameters: Parameters, lean: _Lean, *, arrays: ElectionArrays, priors: Priors
) -> _Regression:
    """Regress what polls saw of the national path on the lean's two ends."""
    knots = arrays.knots
    loadings = lean_loadings(knots.lean_clock, correlation=lean.correlation)
    reference = lean_loadings(np.array([knots.lean_reference]), correlation=lean.correlation)
    free = is_free(arrays.country)
    seen = parameters.walk + parameters.lean
    close = (SEEN_PART * lean.scale)[:, None] ** 2
    # A free party's start is what polls saw of it less the lean of the register's middle.
    start = loadings[:1, :, None] - reference[:, :, None] * free
    start_variance = np.broadcast_to(priors.free_log_sd**2 * free, close.shape)
    steps = np.diff(loadings, axis=0)[:, :, None] + np.zeros_like(free)
    step_variance = (parameters.drift[:, None] * root_of_time(knots, "national", parameters.ramp)) ** 2
    if (arrays.rows.national_weight[:, 0] > 0).any():
        value = np.concatenate([seen[:, :1], np.diff(seen, axis=1)], axis=1)
        slope = np.concatenate([start, steps])
        variance = np.concatenate([np.maximum(start_variance, close), step_variance], axis=1)
    else:
        # The path before the first poll was not seen: it counts from its first knot after the start.
        value = np.concatenate([seen[:, 1:2], np.diff(seen[:, 1:], axis=1)], axis=1)
        slope = np.concatenate([start + steps[:1], steps[1:]])
        variance = np.concatenate([start_variance + step_variance[:, :1], step_variance[:, 1:]], axis=1)
    if arrays.counted is not None:
        weight = np.unique(arrays.counted.national_weight, axis=0)
        count = len(weight)
        value = np.concatenate([value, weight @ parameters.lean], axis=1)
        slope = np.concatenate([slope, (weight @ loadings)[:, :, None] + np.zeros_like(free)])
        variance = np.concatenate([variance, np.repeat(close, count, axis=1)], axis=1)
    return _solve(value, slope, variance, lean.scale)


def _solve(value: Floats, slope: Floats, variance: Floats, scale: Floats) -> _Regression:
    """Normal regression on two standard normal coefficients.

    Parameters
    ----------
    value, variance
        Dims (sample, step, party).
    slope
        Per unit of the scale, dims (step, end, party).
    scale
        Dims (sample, party).
    """
    weighted = np.einsum("kep,skp->skep", slope, 1 / variance) * scale[:, None, None, :]
    precision = np.einsum("skep,kfp->spef", weighted, slope) * scale[:, :, None, None] + np.eye(2)
    pull = np.einsum("skep,skp->spe", weighted, value)
    covariance = np.linalg.inv(precision)
    mean = np.einsum("spef,spf->spe", covariance, pull)
    fit = (value**2 / variance).sum(axis=1) - (pull * mean).sum(axis=-1)
    log_evidence = -0.5 * (fit + np.log(variance).sum(axis=1) + np.log(np.linalg.det(precision)))
    return _Regression(log_evidence, mean, np.linalg.cholesky(covariance))


def _resample(weight: Floats, rng: np.random.Generator) -> np.ndarray:
    """Systematic resampling: as many draws as there were, each about as often as its weight says."""
    count = len(weight)
    points = (np.arange(count) + rng.random()) / count
    at = np.searchsorted(np.cumsum(weight) / weight.sum(), points)
    return np.minimum(at, count - 1)


def _with_new_lean(
    parameters: Parameters,
    lean: _Lean,
    regression: _Regression,
    at: np.ndarray,
    *,
    arrays: ElectionArrays,
    rng: np.random.Generator,
) -> Parameters:
    """Draw the lean anew given what polls saw; the walk is the rest of it."""
    mean, root = regression.mean[at], regression.root[at]
    ends = mean + np.einsum("spef,spf->spe", root, rng.normal(size=mean.shape))
    loadings = lean_loadings(arrays.knots.lean_clock, correlation=lean.correlation)
    new = np.einsum("ke,spe->skp", loadings, ends) * lean.scale[at][:, None]
    return replace(parameters, walk=parameters.walk + parameters.lean - new, lean=new)
