"""Where the truth of an election lies among the draws of its fit.

Simulation-based calibration (Talts, Betancourt, Simpson, Vehtari & Gelman 2018, arXiv:1804.06788): with truth
and polls drawn from the prior, the rank of any true quantity among independent draws of its posterior is
uniform, if and only if model, sampler and everything between are right. Quantities that look at the data too,
the likelihood of all answers among them, find faults that parameters alone hide (Modrák et al. 2023, Bayesian
Analysis, doi:10.1214/23-BA1404).
"""

from __future__ import annotations

import multiprocessing
import time
import warnings
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from datetime import date, timedelta
from functools import cache, partial

import arviz as az
import numpy as np
import pandas as pd
from threadpoolctl import threadpool_limits

from aggregator.estimate.beside_the_polls import draw_region_lean, draw_turnout
from aggregator.estimate.compiled_election import CompiledElection, compile_election
from aggregator.estimate.cores import can_fork, usable_cores
from aggregator.estimate.parameters import Parameters
from aggregator.estimate.poll_fit import row_log_likelihood
from aggregator.estimate.sampling import ChainPlan
from aggregator.estimate.support import Calendar, support_of_regions
from models.arrays import ElectionArrays, Floats
from models.priors import Priors
from tests.calibration.prior_elections import TODAY, PriorElection, draw_election
from tests.calibration.prior_register import (
    COUNTED,
    COUNTED_DAY,
    ERA_HOUSE,
    HOUSES,
    PARTIES,
    POLLING_DAY,
    REGIONS,
    TELEPHONE,
)

# Draws that the truth is ranked among: one hundred ranks.
DRAWS = 99
USUAL_SAMPLE = 900
ELM, FERN = 0, 1
# Houses, eras, modes, populations, formations lie one after the other among the terms of a lean.
FIRST_ERA = len(HOUSES)
FIRST_MODE = FIRST_ERA + len(ERA_HOUSE)
ADULTS, TOGETHER = FIRST_MODE + 2, FIRST_MODE + 3

VOTE = date(2031, 5, 18)
CALENDAR = Calendar(
    dates=pd.DatetimeIndex([VOTE - timedelta(days=POLLING_DAY - TODAY)]),
    voting=tuple(
        VOTE - timedelta(days=(POLLING_DAY - COUNTED_DAY) * (region == COUNTED))
        for region in range(len(REGIONS))
    ),
    jolts={},
)

Told = Callable[[ElectionArrays], ElectionArrays]


def the_truth(arrays: ElectionArrays) -> ElectionArrays:
    """Tell the model what the election was drawn from."""
    return arrays


@dataclass(frozen=True)
class Length:
    """Length of one fit's chain; a fit with too few effective draws is run again, longer each time."""

    tune: int = 150
    draws: int = 396
    longer: int = 4
    attempts: int = 3


@dataclass(frozen=True)
class RankedElection:
    """One election's ranks.

    Attributes
    ----------
    seed
        Of the election and of its fit.
    place
        Where the truth lies among the draws, by quantity: between 0 and 1, uniform where all is right. The
        rank among 99 draws, with the place inside it drawn evenly.
    effective_draws
        Least effective sample size over the quantities, of all draws before they were thinned.
    seconds
        Time of the fit.
    """

    seed: int
    place: dict[str, float]
    effective_draws: float
    seconds: float


def rank_elections(
    seeds: Sequence[int], *, told: Told = the_truth, length: Length | None = None
) -> Iterator[RankedElection]:
    """Draw, fit and rank an election for each seed, in their order, on all cores."""
    work = partial(rank_election, told=told, length=length or Length())
    # Compiled before the processes are forked, so that all of them have it.
    compiled_model()
    cores = min(usable_cores(), len(seeds))
    if cores == 1 or not can_fork():
        yield from map(work, seeds)
        return
    with (
        warnings.catch_warnings(),
        ProcessPoolExecutor(cores, mp_context=multiprocessing.get_context("fork")) as pool,
    ):
        # Python warns of fork beside threads; the child touches none of the parent's threads.
        warnings.simplefilter("ignore", DeprecationWarning)
        yield from pool.map(work, seeds)


def rank_election(seed: int, *, told: Told, length: Length) -> RankedElection:
    """Draw an election, fit it as told, and find the truth's place among the draws."""
    started = time.monotonic()
    draw_seed, chain_seed, rest_seed = np.random.SeedSequence(seed).spawn(3)
    election = draw_election(np.random.default_rng(draw_seed))
    rng = np.random.default_rng(rest_seed)
    with threadpool_limits(1):
        fit = compile_election(told(election.arrays), priors=Priors(), like=compiled_model())
        for attempt in range(length.attempts):
            plan = ChainPlan(
                chains=1,
                tune=length.tune,
                draws=length.draws * length.longer**attempt,
                seed=int(chain_seed.generate_state(1)[0]),
            )
            parameters, _ = fit.sample(plan, progress=lambda _part: None)
            drawn = quantities_of_draws(parameters, arrays=fit.arrays, priors=fit.priors, rng=rng)
            effective = min(float(az.ess(values[None, :])) for values in drawn.values())
            if effective >= DRAWS:
                break
    kept = np.linspace(0, plan.draws - 1, DRAWS).round().astype(int)
    truth = true_quantities(election)
    place = {
        name: ((values[kept] < truth[name]).sum() + rng.random()) / (DRAWS + 1)
        for name, values in drawn.items()
    }
    return RankedElection(
        seed=seed, place=place, effective_draws=effective, seconds=time.monotonic() - started
    )


@cache
def compiled_model() -> CompiledElection:
    """Compile the model once: every election drawn from the prior has the same graph."""
    return compile_election(draw_election(np.random.default_rng(0)).arrays, priors=Priors())


def quantities_of_draws(
    parameters: Parameters, *, arrays: ElectionArrays, priors: Priors, rng: np.random.Generator
) -> dict[str, Floats]:
    """Tested quantities by name, each with dims (sample); support is found as it is for publication."""
    samples = len(parameters.kappa)
    country = arrays.country
    region_lean = draw_region_lean(
        samples, country=country, lean_size=country.lean_size, priors=priors, rng=rng
    )
    support = support_of_regions(
        parameters, arrays=arrays, calendar=CALENDAR, region_lean=region_lean
    ).astype(float)
    turnout = draw_turnout(support[:, -1], turnout=country.turnout, rng=rng)
    national = np.einsum("sr,sdrp->sdp", turnout, support)
    likelihood = row_log_likelihood(parameters, arrays=arrays, samples=np.arange(samples)).sum(axis=1)
    terms = parameters.terms
    return _named(
        drift=parameters.drift,
        house_scale=parameters.house_scale,
        region_ratio=parameters.region_ratio,
        ramp=parameters.ramp,
        design_effect=parameters.kappa[:, 0] + (USUAL_SAMPLE - 1) * parameters.rho[:, 0],
        house=terms[:, 1, ELM],
        era=terms[:, FIRST_ERA + 1, ELM],
        telephone=terms[:, FIRST_MODE + TELEPHONE, ELM],
        adults=terms[:, ADULTS, ELM],
        together=terms[:, TOGETHER, FERN],
        shared_lean=parameters.lean[:, -1, ELM],
        today=national[:, 0],
        polling_day=national[:, 1],
        region=support[:, -1, 1, ELM],
        likelihood=likelihood,
    )


def true_quantities(election: PriorElection) -> dict[str, float]:
    """The same quantities of the election itself."""
    scales, leans = election.scales, election.leans
    values = _named(
        drift=scales.drift[None],
        house_scale=scales.house[None],
        region_ratio=np.array([scales.region_ratio]),
        ramp=np.array([scales.ramp_log_height]),
        design_effect=scales.kappa[:1] + (USUAL_SAMPLE - 1) * scales.rho[:1],
        house=leans.houses[1:2, ELM],
        era=leans.eras[1:2, ELM],
        telephone=leans.modes[TELEPHONE : TELEPHONE + 1, ELM],
        adults=leans.populations[:1, ELM],
        together=leans.formations[:1, FERN],
        shared_lean=leans.shared[-1:, ELM],
        today=election.national_today[None],
        polling_day=election.national_polling_day[None],
        region=election.regional_polling_day[1:2, ELM],
        likelihood=np.array([election.log_likelihood]),
    )
    return {name: float(value[0]) for name, value in values.items()}


def _named(
    *,
    drift: Floats,
    house_scale: Floats,
    region_ratio: Floats,
    ramp: Floats,
    design_effect: Floats,
    house: Floats,
    era: Floats,
    telephone: Floats,
    adults: Floats,
    together: Floats,
    shared_lean: Floats,
    today: Floats,
    polling_day: Floats,
    region: Floats,
    likelihood: Floats,
) -> dict[str, Floats]:
    """Give quantities the names a reader sees; scales and supports have dims (sample, party)."""
    ordered = np.sort(polling_day, axis=1)
    return {
        "drift, all parties": np.log(drift).mean(axis=1),
        "house effects, size": np.log(house_scale).mean(axis=1),
        "regional over national drift": region_ratio,
        "ramp towards polling day": ramp,
        "design effect of a house": design_effect,
        "effect of a house": house,
        "a house's second era": era,
        "telephone lean": telephone,
        "lean of asking adults": adults,
        "lean of asking together": together,
        "shared lean, polling day": shared_lean,
        **{f"{party}, today": today[:, p] for p, party in enumerate(PARTIES)},
        **{f"{party}, polling day": polling_day[:, p] for p, party in enumerate(PARTIES)},
        "Elm in one region": region,
        "first over second": ordered[:, -1] - ordered[:, -2],
        "likelihood of the answers": likelihood,
    }
