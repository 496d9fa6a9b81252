r"""How much of each headline number is data, and how much is assumption.

Two questions are answered for every number. *Would it move with the assumption?* The density of one part of
the model (the priors of the scales, the lean that all polls share, the polls) is raised to a power α close to
one, by importance weights on the draws at hand, and the distance between the number's old and new
distribution is measured (the cumulative Jensen–Shannon distance, per doubling of α): power-scaling [1]_, as
arviz computes it. *Where does its uncertainty come from?* Its variance is parted by regression on what the
draws themselves hold: the shared lean, the drift still to come, and the rest.

Only priors of scales and baselines are scaled, not the walks and leans that these scales govern: those are
parts of the model and not beliefs about its size, as [1]_ advises for hierarchical models.

The distance is a root of a mean of squares, so that the noise of a finite number of draws adds to it and
never cancels. With thousands of dimensions the log-likelihood varies by a dozen units over the draws, and the
noise alone exceeds the published threshold of 0.05. So the noise is measured, on weights shifted along the
chains, where they can tell nothing; it is taken off in squares, and what does not exceed it is left blank.

References
----------
.. [1] Kallioinen, N., Paananen, T., Bürkner, P.-C. and Vehtari, A. (2024). Detecting and diagnosing prior
   and likelihood sensitivity with power-scaling. Statistics and Computing 34, 57.
   doi:10.1007/s11222-023-10366-5
.. [2] Vehtari, A., Simpson, D., Gelman, A., Yao, Y. and Gabry, J. (2024). Pareto smoothed importance
   sampling. Journal of Machine Learning Research 25(72), 1–58.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
import xarray as xr
from arviz_stats.base import array_stats

from aggregator.estimate.cores import map_forked, usable_cores
from aggregator.estimate.knots import knot_weights
from aggregator.estimate.log_density import Layout
from aggregator.estimate.parameters import Parameters
from aggregator.estimate.poll_fit import DRAWS_AT_ONCE, row_log_likelihood
from aggregator.inputs.contest import OTHERS, Contest
from models.arrays import ElectionArrays, Floats
from models.dimensions import CHAIN, DATE, DRAW, PARTY
from models.priors import Priors

# The published default. On the demo (250 polls, 2,000 coordinates) Pareto-k stays below .1 here and below .4
# at 1/1.1 and 1.1; at .8 and 1.25 it passes .7. A sensitivity is the same number at 1.01 and at 1.05.
ALPHAS = (0.99, 1.01)
# Above this a number counts as sensitive [1].
SENSITIVE_FROM = 0.05
NOISE_SHIFTS = 12
# A distance this many standard deviations of the noise above its mean is no noise.
NOISE_SDS = 2.0
WORST_PARETO_K = 0.7

PRIOR, SHARED_LEAN, POLLS = "prior", "shared_lean", "polls"
LEAN_ENDS = "shared_lean_ends"
MODES = "_modes"
ON_DATE, ON_POLLING_DAY = "on_date", "on_polling_day"
SEATS = "seats_on_polling_day"
REST = (
    "what polls, regions and turnout leave open",
    "what polls, regions, turnout and single seats leave open",
)
LARGEST_SHOWN = 3


def log_prior_terms(positions: Floats, *, layout: Layout, priors: Priors) -> dict[str, Floats]:
    """Log density of the priors of scales and baselines, and of the shared lean, up to a constant.

    Parameters
    ----------
    positions
        Flat draws, dims (…, coordinate).
    layout
        Where each variable lies in the vector.
    priors
        What the model assumed.

    Returns
    -------
    ``prior`` and, where the model has one, ``shared_lean``, dims (…).

    Raises
    ------
    KeyError
        If the model has a variable whose prior is not known here.
    """
    centred = {
        "drift_log": (priors.drift_log_median, priors.drift_log_sd),
        "house_scale_log": (priors.house_log_median, priors.house_log_sd),
        "weighting_loss_log": (priors.weighting_loss_log_median, priors.weighting_loss_log_sd),
        "error_floor_log": (priors.error_floor_log_median, priors.error_floor_log_sd),
        "ramp_log_height": (0.0, priors.ramp_log_sd),
    }
    scales = np.zeros(positions.shape[:-1])
    terms = {PRIOR: scales}
    for name in layout.names:
        if name.endswith(MODES):
            continue
        standard = name == LEAN_ENDS or name.endswith("_own")
        median, sd = (0.0, 1.0) if standard else centred[name]
        value = positions[..., layout.place(name)]
        density = -0.5 * (((value - median) / sd) ** 2).sum(axis=-1)
        if name == LEAN_ENDS:
            terms[SHARED_LEAN] = density
        else:
            scales += density
    return terms


def measure_sensitivity(
    numbers: xr.Dataset, *, terms: Mapping[str, Floats], rng: np.random.Generator
) -> pd.DataFrame:
    """Measure how far numbers move when parts of the model count for more or less.

    Parameters
    ----------
    numbers
        Variables with dims (chain, draw) only.
    terms
        Log density of each part of the model, dims (chain, draw).
    rng
        For the shifts by which the noise is measured.

    Returns
    -------
    pd.DataFrame
        One row per number, one column per part: the distance per doubling of the power, NaN where it cannot
        be told from noise, or where the weights are too uneven to say.
    """
    return pd.DataFrame(
        {name: _told_from_noise(numbers, term, rng=rng) for name, term in terms.items()},
        index=list(numbers.data_vars),
    )


def _told_from_noise(numbers: xr.Dataset, term: Floats, *, rng: np.random.Generator) -> Floats:
    unknown = np.full(len(numbers.data_vars), np.nan)
    if np.ptp(term) == 0 or _worst_pareto_k(term) > _pareto_limit(term.size):
        return unknown
    values = np.stack([number.transpose(CHAIN, DRAW).to_numpy() for number in numbers.data_vars.values()])
    weights = [_power_weights(term, alpha=alpha) for alpha in ALPHAS]
    found = _distances(values, weights)
    draws = term.shape[1]
    shifts = rng.integers(draws // 10, draws - draws // 10, size=NOISE_SHIFTS)
    noise = np.stack(
        [_distances(values, [np.roll(w[::-1], shift, axis=1) for w in weights]) for shift in shifts]
    )
    told = found > noise.mean(axis=0) + NOISE_SDS * noise.std(axis=0, ddof=1)
    clean = np.sqrt(np.maximum(found**2 - (noise**2).mean(axis=0), 0.0))
    return np.where(told & (clean > 0), clean, unknown)


def _power_weights(term: Floats, *, alpha: float) -> Floats:
    weights = np.exp(array_stats.power_scale_lw(term, alpha=alpha, axis=(0, 1)))
    return weights / weights.sum()


def _distances(values: Floats, weights: list[Floats]) -> Floats:
    """Power-scaling sensitivity of each number, dims (number)."""
    lower, upper = (np.broadcast_to(weight, values.shape) for weight in weights)
    return array_stats.power_scale_sense(values, lower, upper, lower_alpha=ALPHAS[0], upper_alpha=ALPHAS[1])


def _worst_pareto_k(term: Floats) -> float:
    # The library's function takes a log-likelihood and weighs by its inverse.
    return max(float(array_stats.psislw((1 - alpha) * term.ravel())[1]) for alpha in ALPHAS)


def _pareto_limit(samples: int) -> float:
    """Largest k at which the weights of so many draws can be relied on [2]_."""
    return min(1 - 1 / np.log10(samples), WORST_PARETO_K)


def explained_part(number: Floats, *, causes: list[Floats]) -> list[float]:
    """Part of a number's variance that each cause explains beyond those before it, 0–1.

    Adjusted for the number of regressors, so that noise explains nothing on average.

    Parameters
    ----------
    number
        Dims (sample).
    causes
        Each with dims (sample, …); causes without variation explain nothing.
    """
    samples = len(number)
    total = float(number.var())
    if total == 0:
        return [0.0 for _ in causes]
    design, explained, parts = np.ones((samples, 1)), 0.0, []
    for cause in causes:
        columns = np.asarray(cause, dtype=float).reshape(samples, -1)
        design = np.column_stack([design, columns[:, np.ptp(columns, axis=0) > 0]])
        fitted, _, rank, _ = np.linalg.lstsq(design, number, rcond=None)
        left = float(((number - design @ fitted) ** 2).sum()) / max(samples - int(rank), 1)
        now = max(1.0 - left / total, explained)
        parts.append(now - explained)
        explained = now
    return parts


@dataclass(frozen=True)
class HeadlineNumber:
    """A number whose grounds are asked for.

    Attributes
    ----------
    quantity, code, words
        What it is: a short name, whose it is, and the same for a sentence.
    draws
        Dims (chain, draw).
    causes
        What of its variance is traced: the shared lean and the drift to come, dims (sample, party) each.
    """

    quantity: str
    code: str
    words: str
    draws: Floats
    causes: tuple[Floats, Floats]


def summarise_prior_sensitivity(
    draws: xr.Dataset,
    *,
    seats: xr.Dataset | None,
    positions: Floats,
    layout: Layout,
    parameters: Parameters,
    arrays: ElectionArrays,
    priors: Priors,
    contest: Contest,
    rng: np.random.Generator,
) -> pd.DataFrame:
    """Say of each headline number how much of it is data, and how much assumption.

    Parameters
    ----------
    draws
        Published quantities: ``national_support`` (chain, draw, date, party) and its polling-day twin.
    seats
        ``seats_polling_day`` (chain, draw, party); None where nothing is counted in seats.
    positions
        The flat draws behind them, dims (sample, coordinate), sample = chain · draws + draw.
    layout
        Where each variable lies in the vector.
    parameters, arrays, priors
        The same draws as parameters, what the model was given, and what it assumed.
    contest
        Names of the parties, and the counting rule's majority.
    rng
        For measuring the noise.

    Returns
    -------
    pd.DataFrame
        One row per number: ``quantity``, ``code``; ``prior``, ``shared_lean``, ``polls`` (distance per
        doubling, NaN where too small to be told from noise); ``variance_shared_lean``, ``variance_drift``,
        ``variance_polls`` (percent, sum 100); ``words``.
    """
    shape = (draws.sizes[CHAIN], draws.sizes[DRAW])
    terms = {
        name: term.reshape(shape)
        for name, term in log_prior_terms(positions, layout=layout, priors=priors).items()
    }
    terms[POLLS] = _log_likelihood(parameters, arrays=arrays).reshape(shape)
    numbers = _headline_numbers(
        draws, seats=seats, contest=contest, causes=_causes(draws, parameters, arrays)
    )
    table = measure_sensitivity(
        xr.Dataset({str(i): ((CHAIN, DRAW), number.draws) for i, number in enumerate(numbers)}),
        terms=terms,
        rng=rng,
    )
    rows = []
    for number, (_, moved) in zip(numbers, table.iterrows(), strict=True):
        lean, drift = (
            100 * part for part in explained_part(number.draws.ravel(), causes=list(number.causes))
        )
        row = {
            "quantity": number.quantity,
            "code": number.code,
            **{name: moved.get(name, np.nan) for name in (PRIOR, SHARED_LEAN, POLLS)},
            "variance_shared_lean": lean,
            "variance_drift": drift,
            "variance_polls": 100 - lean - drift,
        }
        rows.append(row | {"words": word_sensitivity(number.words, row)})
    return pd.DataFrame(rows)


def word_sensitivity(number: str, row: Mapping[str, object]) -> str:
    """Say where a number's uncertainty comes from, and which assumptions would move it.

    Parameters
    ----------
    number
        The number, as it stands in a sentence.
    row
        Its row of the table, without words.
    """
    parts = {
        "the assumed error that all polls share": float(row["variance_shared_lean"]),  # type: ignore[arg-type]
        "opinion that may still move": float(row["variance_drift"]),  # type: ignore[arg-type]
        REST[row["quantity"] == SEATS]: float(row["variance_polls"]),  # type: ignore[arg-type]
    }
    ordered = sorted(parts.items(), key=lambda part: -part[1])
    (first, most), *others = [(name, round(part)) for name, part in ordered]
    rest = ", ".join(f"{part} % {name}" for name, part in others if part >= 1)
    opening = (
        f"How sure the model is of {number} rests {'mostly ' if most >= 50 else 'first '}on {first} "
        f"({most} % of the variance{f'; {rest}' if rest else ''})"
    )
    lean, prior = (float(row[name]) for name in (SHARED_LEAN, PRIOR))  # type: ignore[arg-type]
    moved = " It would move with the size of that error." if lean >= SENSITIVE_FROM else ""
    held = "would move it too" if prior >= SENSITIVE_FROM else "hardly matter to it"
    return f"{opening}.{moved} The priors of the model's scales {held}."


def _log_likelihood(parameters: Parameters, *, arrays: ElectionArrays) -> Floats:
    """Log density of all figures, dims (sample)."""

    def of_samples(samples: np.ndarray) -> Floats:
        parts = np.array_split(samples, max(1, len(samples) // DRAWS_AT_ONCE))
        return np.concatenate(
            [row_log_likelihood(parameters, arrays=arrays, samples=part).sum(axis=1) for part in parts]
        )

    shares = np.array_split(np.arange(len(parameters.kappa)), usable_cores())
    return np.concatenate(map_forked(of_samples, shares))


def _causes(draws: xr.Dataset, parameters: Parameters, arrays: ElectionArrays) -> dict[str, tuple]:
    """Shared lean and drift behind support on the day of the run and on polling day."""
    knots = arrays.knots
    days_left = (
        pd.Timestamp(draws.attrs["polling_day"]) - pd.Timestamp(draws.attrs["run_date"])
    ) / pd.Timedelta(days=1)
    today = np.array([knots.national_day[-1] - max(days_left, 0.0)])
    weight = knot_weights(knots.national_day, first_day=today, last_day=today)
    lean = (weight @ parameters.lean)[:, 0]
    drift = parameters.walk[:, -1] - (weight @ parameters.walk)[:, 0]
    return {ON_DATE: (lean, np.zeros_like(drift)), ON_POLLING_DAY: (parameters.lean[:, -1], drift)}


def _headline_numbers(
    draws: xr.Dataset, *, seats: xr.Dataset | None, contest: Contest, causes: dict[str, tuple]
) -> list[HeadlineNumber]:
    today = draws["national_support"].isel({DATE: -1}, drop=True)
    mean = today.mean((CHAIN, DRAW)).sel({PARTY: today[PARTY] != OTHERS})
    largest = [str(mean[PARTY].values[place]) for place in np.argsort(-mean.values, kind="stable")]
    day = pd.Timestamp(draws.attrs["run_date"])
    shown: list[tuple[str, str, str, xr.DataArray, str]] = []
    for code in largest[:LARGEST_SHOWN]:
        name = contest.party_names[code]
        voted = draws["national_support_polling_day"]
        shown.append(("support_on_date", code, f"{name} on {day.day} {day:%B %Y}", today, ON_DATE))
        shown.append(("support_on_polling_day", code, f"{name} on polling day", voted, ON_POLLING_DAY))
        if seats is not None:
            won = seats["seats_polling_day"]
            shown.append((SEATS, code, f"the seats of {name}", won, ON_POLLING_DAY))
    return [
        HeadlineNumber(
            quantity=quantity,
            code=code,
            words=words,
            draws=values.sel({PARTY: code}).transpose(CHAIN, DRAW).to_numpy().astype(float),
            causes=causes[day_of],
        )
        for quantity, code, words, values, day_of in shown
    ]
