"""Fit the election model to a contest's polls and judge the fit."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
import pandas as pd
import xarray as xr
from threadpoolctl import threadpool_limits

from aggregator.estimate.compiled_election import CompiledElection, compile_election
from aggregator.estimate.log_density import Layout
from aggregator.estimate.model_arrays import build_arrays
from aggregator.estimate.parameters import Parameters
from aggregator.estimate.poll_fit import pareto_k_by_poll
from aggregator.estimate.sampler_checks import (
    Convergence,
    Limits,
    check_convergence,
    judge_fit,
    only_needs_more_draws,
)
from aggregator.estimate.sampling import CAREFUL_ACCEPT, ChainPlan
from aggregator.estimate.support import Calendar, series_dates, summarise_support
from aggregator.inputs.contest import ModelOverrides
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.settings import RunSettings
from aggregator.verdict import Verdict
from models.arrays import ElectionArrays, Floats
from models.priors import Priors, shared_lean_scale

Progress = Callable[[str, float], None]

# Each stage's own stream of random numbers, so that one more draw in one moves nothing in another.
CHAINS_STREAM, OUTPUT_STREAM = 0, 1


@dataclass(frozen=True)
class CompiledContest:
    """A contest whose model is compiled and ready to be fitted.

    Attributes
    ----------
    inputs
        The desk's checked files.
    election
        The compiled model.
    eras
        Eras of the houses, from :func:`aggregator.estimate.lean_terms_of_rows.list_eras`.
    """

    inputs: DeskInputs
    election: CompiledElection
    eras: pd.DataFrame


@dataclass(frozen=True)
class Fit:
    """A fitted contest.

    Attributes
    ----------
    draws
        Published quantities per draw; see :func:`aggregator.estimate.support.summarise_support`.
    arrays
        What the model was given.
    priors
        What the model assumed.
    parameters
        Draws of the model's parameters, sample = chain · draws + draw.
    positions, layout
        The same draws as the sampler made them, dims (sample, coordinate), and where each variable lies.
    convergence, verdict
        The checks.
    pareto_k
        Pareto-k of each poll, by its identifier; empty where it was not asked for.
    settings
        The settings in use, after a continuation if there was one.
    """

    draws: xr.Dataset
    arrays: ElectionArrays
    priors: Priors
    parameters: Parameters
    positions: Floats
    layout: Layout
    convergence: Convergence
    verdict: Verdict
    pareto_k: dict[str, float]
    settings: RunSettings


def compile_contest(inputs: DeskInputs, *, like: CompiledElection | None = None) -> CompiledContest:
    """Build and compile the model of a contest.

    Parameters
    ----------
    inputs
        The desk's checked files.
    like
        A compiled election that is not needed any more, such as the same contest's on another day; where
        only numbers differ, its compilation is used. See `compile_election`.
    """
    # One thread for linear algebra: sums in another order would change the last digit, then the chains.
    with threadpool_limits(1):
        priors = _priors(inputs.contest.model)
        contest = build_arrays(inputs, priors=priors)
        election = compile_election(
            contest.arrays, priors=priors, shared_lean=inputs.contest.model.shared_lean, like=like
        )
    return CompiledContest(inputs, election, contest.eras)


def fit_contest(
    inputs: DeskInputs,
    *,
    settings: RunSettings,
    limits: Limits | None = None,
    second_attempts: bool = True,
    progress: Progress = lambda _stage, _part: None,
) -> Fit:
    """Compile one contest and fit it; see `fit_compiled`."""
    progress("building the model", 0.0)
    return fit_compiled(
        compile_contest(inputs),
        settings=settings,
        limits=limits,
        second_attempts=second_attempts,
        progress=progress,
    )


def fit_compiled(
    contest: CompiledContest,
    *,
    settings: RunSettings,
    limits: Limits | None = None,
    second_attempts: bool = True,
    weigh_polls: bool = True,
    whole_series: bool = True,
    processes: int | None = None,
    progress: Progress = lambda _stage, _part: None,
) -> Fit:
    """Fit one contest.

    A fit with divergent steps is run once more with smaller steps. A fit that then misses nothing but R-hat
    or effective sample size is continued once: the same chains, twice as long.

    Parameters
    ----------
    contest
        The compiled contest.
    settings
        Length and seed.
    limits
        What the fit must meet.
    second_attempts
        Whether to do so; a study that only needs rough draws does not.
    weigh_polls
        Whether to find Pareto-k of each poll.
    whole_series
        Whether to work out every week from the first fieldwork on; a refit needs the day of the run and
        polling day, and those are the same either way.
    processes
        Processes to share the work; 1 does all of it in this process, None takes one per usable core. The
        fit is the same.
    progress
        Called with the stage's name and its finished part, 0–1.

    Raises
    ------
    MachineError
        If a sampling process died.
    """
    limits = limits or Limits()
    # One thread for linear algebra: as in `compile_contest`.
    with threadpool_limits(1):
        attempt = partial(
            _sample,
            contest,
            limits=limits,
            weigh_polls=weigh_polls,
            whole_series=whole_series,
            processes=processes,
            progress=progress,
        )
        fit = attempt(settings=settings)
        if second_attempts and fit.convergence.divergences > limits.divergences:
            settings = replace(settings, target_accept=CAREFUL_ACCEPT)
            fit = attempt(settings=settings)
        if second_attempts and only_needs_more_draws(fit.convergence, limits=limits):
            fit = attempt(settings=replace(settings, draws=2 * settings.draws))
    return fit


def _sample(
    compiled: CompiledContest,
    *,
    settings: RunSettings,
    limits: Limits,
    weigh_polls: bool,
    whole_series: bool,
    processes: int | None,
    progress: Progress,
) -> Fit:
    inputs, election = compiled.inputs, compiled.election
    contest, arrays = inputs.contest, election.arrays
    streams = np.random.SeedSequence(settings.seed).spawn(2)
    progress("drawing from the model", 0.0)
    parameters, chains = election.sample(
        ChainPlan(
            chains=settings.chains,
            tune=settings.tune,
            draws=settings.draws,
            seed=int(streams[CHAINS_STREAM].generate_state(1)[0]),
            target_accept=settings.target_accept,
        ),
        progress=lambda part: progress("drawing from the model", part),
        processes=processes,
    )
    progress("summarising the draws", 0.0)
    calendar = release_calendar(inputs)
    if not whole_series:
        calendar = replace(calendar, dates=calendar.dates[-1:])
    draws = summarise_support(
        parameters,
        arrays=arrays,
        eras=compiled.eras,
        chains=settings.chains,
        calendar=calendar,
        shared_lean=contest.model.shared_lean,
        priors=election.priors,
        rng=np.random.default_rng(streams[OUTPUT_STREAM]),
    )
    draws.attrs |= {
        "run_date": inputs.run_date.isoformat(),
        "polling_day": contest.last_polling_day.isoformat(),
        "seed": settings.seed,
    }
    progress("checking the draws", 0.0)
    convergence = check_convergence(
        draws.drop_vars(["kappa", "rho", "opinion_clock"]),
        divergences=int(chains["diverging"].sum()),
        processes=processes,
    )
    return Fit(
        draws=draws,
        arrays=arrays,
        priors=election.priors,
        parameters=parameters,
        positions=chains["position"].to_numpy().reshape(-1, election.density.layout.size),
        layout=election.density.layout,
        convergence=convergence,
        verdict=judge_fit(convergence, limits=limits),
        pareto_k=pareto_k_by_poll(parameters, arrays=arrays, chains=settings.chains) if weigh_polls else {},
        settings=settings,
    )


def release_calendar(inputs: DeskInputs) -> Calendar:
    """Lay out the days a contest's release speaks of."""
    contest = inputs.contest
    return Calendar(
        dates=series_dates(first_fieldwork=inputs.polls["start"].min().date(), run_date=inputs.run_date),
        voting=tuple(contest.polling_day_of(region) for region in contest.region_codes),
        jolts={jolt.date: jolt.weeks for jolt in contest.jolts},
    )


def _priors(overrides: ModelOverrides) -> Priors:
    return Priors(
        shared_lean=shared_lean_scale(overrides.shared_lean_points),
        lean_correlation=overrides.shared_lean_correlation,
    )
