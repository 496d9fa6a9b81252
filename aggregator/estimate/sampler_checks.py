"""Whether the draws can be trusted: the checks every fit must pass before its numbers are published.

References
----------
Vehtari, Gelman, Simpson, Carpenter & Bürkner (2021), "Rank-normalization, folding, and localization: an
improved R-hat for assessing convergence of MCMC", Bayesian Analysis 16:667–718. doi:10.1214/20-BA1221
"""

from __future__ import annotations

from dataclasses import dataclass

import arviz as az
import numpy as np
import pandas as pd
import xarray as xr

from aggregator.estimate.cores import map_forked, usable_cores
from aggregator.verdict import Verdict
from models.arrays import Floats
from models.dimensions import CHAIN, DATE, DRAW

# A series is a straight line between knots: every fourth day of it, and its last, stand for the others.
SERIES_STRIDE = 4
# With fewer, starting a process takes longer than its share of the work.
LEAST_QUANTITIES_PER_PROCESS = 100


@dataclass(frozen=True)
class Limits:
    """What a fit must meet.

    Attributes
    ----------
    rhat
        Largest rank-normalised split R-hat (Vehtari et al. 2021).
    ess
        Smallest effective sample size, bulk and tail (same source).
    divergences
        Most divergent transitions.
    """

    rhat: float = 1.01
    ess: float = 400
    divergences: int = 0


@dataclass(frozen=True)
class Convergence:
    """Worst diagnostics over all published quantities.

    Attributes
    ----------
    worst_rhat, least_bulk, least_tail
        The quantity's name and its value.
    divergences
        Number of divergent transitions.
    quantities, constant
        How many quantities were judged, and how many are constant over draws and hence exempt.
    """

    worst_rhat: tuple[str, float]
    least_bulk: tuple[str, float]
    least_tail: tuple[str, float]
    divergences: int
    quantities: int
    constant: int


def check_convergence(
    published: xr.Dataset, *, divergences: int, processes: int | None = None
) -> Convergence:
    """Diagnose every published quantity.

    Parameters
    ----------
    published
        Variables with dims (chain, draw, …).
    divergences
        Divergent transitions of the run.
    processes
        Processes to share the work; None takes one per usable core.
    """
    values, names, constant = [], [], 0
    for name, variable in published.data_vars.items():
        if CHAIN not in variable.dims:
            continue
        chosen = _thin_series(variable)
        flat = chosen.transpose(CHAIN, DRAW, ...).to_numpy().reshape(*chosen.shape[:2], -1)
        moving = (flat != flat[:1, :1]).any(axis=(0, 1))
        constant += int((~moving).sum())
        values.append(flat[..., moving].astype(float))
        names += [str(name)] * int(moving.sum())
    shares = max(1, min(processes or usable_cores(), len(names) // LEAST_QUANTITIES_PER_PROCESS))
    parts = np.array_split(np.concatenate(values, axis=-1), shares, axis=-1)
    rhat, bulk, tail = np.concatenate(map_forked(_diagnose, parts), axis=-1)

    def pick(value: np.ndarray, at: int) -> tuple[str, float]:
        return names[at], float(value[at])

    return Convergence(
        worst_rhat=pick(rhat, int(np.nanargmax(rhat))),
        least_bulk=pick(bulk, int(np.nanargmin(bulk))),
        least_tail=pick(tail, int(np.nanargmin(tail))),
        divergences=divergences,
        quantities=len(names),
        constant=constant,
    )


def _diagnose(values: Floats) -> Floats:
    """R-hat, bulk and tail ESS, dims (diagnostic, quantity), of values with dims (chain, draw, quantity)."""
    together = xr.Dataset({"value": ((CHAIN, DRAW, "quantity"), values)})
    found = (az.rhat(together), az.ess(together), az.ess(together, method="tail"))
    return np.stack([diagnostic["value"].to_numpy() for diagnostic in found])


def _thin_series(variable: xr.DataArray) -> xr.DataArray:
    if DATE not in variable.dims:
        return variable
    last = variable.sizes[DATE] - 1
    return variable.isel({DATE: sorted({*range(last, -1, -SERIES_STRIDE)})})


def only_needs_more_draws(found: Convergence, *, limits: Limits) -> bool:
    """Whether the fit misses nothing but R-hat or effective sample size."""
    return found.divergences <= limits.divergences and not _passed(found, limits)


def judge_fit(found: Convergence, *, limits: Limits) -> Verdict:
    """Turn diagnostics into a verdict."""
    rows = [
        (
            "largest R-hat",
            found.worst_rhat[1],
            f"at most {limits.rhat}",
            found.worst_rhat[1] <= limits.rhat,
            f"chains that disagree about {_words(found.worst_rhat[0])} have not found the same answer",
        ),
        (
            "smallest bulk ESS",
            found.least_bulk[1],
            f"at least {limits.ess:g}",
            found.least_bulk[1] >= limits.ess,
            f"too few effective draws for the mean of {_words(found.least_bulk[0])}",
        ),
        (
            "smallest tail ESS",
            found.least_tail[1],
            f"at least {limits.ess:g}",
            found.least_tail[1] >= limits.ess,
            f"too few effective draws for the interval of {_words(found.least_tail[0])}",
        ),
        (
            "divergences",
            float(found.divergences),
            f"at most {limits.divergences}",
            found.divergences <= limits.divergences,
            "the sampler could not follow the posterior everywhere",
        ),
    ]
    table = pd.DataFrame(rows, columns=["check", "value", "limit", "passed", "meaning"])
    passed = bool(table["passed"].all())
    missed = ", ".join(table.loc[~table["passed"], "check"])
    exempt = (
        f" {found.constant} quantities that are the same in every draw are exempt." if found.constant else ""
    )
    text = (
        f"All checks passed on {found.quantities} published quantities: "
        f"R-hat at most {found.worst_rhat[1]:.3f}, "
        f"effective draws at least {min(found.least_bulk[1], found.least_tail[1]):.0f}, "
        f"{found.divergences} divergences.{exempt}"
        if passed
        else f"Checks failed ({missed}): do not publish these numbers. Run again with more draws, "
        f"and if that does not help look at the register's warnings.{exempt}"
    )
    return Verdict(passed=passed, table=table, text=text)


def _passed(found: Convergence, limits: Limits) -> bool:
    return bool(judge_fit(found, limits=limits).table["passed"].all())


def _words(name: str) -> str:
    return name.replace("_", " ")
