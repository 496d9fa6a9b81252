"""What is kept of one fit: thinned draws of what replays and studies score, and the facts of the fit."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import xarray as xr

from aggregator.estimate.fit import Fit
from aggregator.estimate.predictive_checks import summarise_predictive
from aggregator.inputs.contest import Contest
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.refits.program_version import program_version
from aggregator.seats.desk_count import count_polling_day
from aggregator.settings import PREDICTIVE_STREAM, SEATS_STREAM
from aggregator.shelf_life.worth import summarise_shelf_life
from models.dimensions import CHAIN, DATE, DRAW, PARTY, REGION

# Enough for scores: the Monte Carlo error of a 95 % interval's end is then below a tenth of its width.
MOST_DRAWS = 1000
AGE, CODE = "age", "code"
AGES = tuple(range(91))
POLL_OF = 1000


@dataclass(frozen=True)
class FitRecord:
    """What is kept of one fit.

    Attributes
    ----------
    key
        Name of the fit; that of its task.
    data
        ``national_support`` (draw, party) on the run date, ``national_support_polling_day`` (draw, party),
        ``support_polling_day`` (draw, region, party): shares 0–1, at most `MOST_DRAWS` draws. Where seats
        are counted, of polling day: ``seats_polling_day`` (draw, party), and ``seat_chance`` (seat, party)
        over all draws, with the coordinate ``seat_region``. ``expected_error`` (age, code) in points: the
        shelf-life formula's error of a poll of 1,000 taken ``age`` days before the run date and held
        against polling day; the codes are parties and the alliances of polling day.
    facts
        ``as_of`` and ``polling_day`` (ISO dates), ``seed``, ``settings`` (those asked for), ``draws`` and
        ``target_accept`` (those in use in the end), ``passed``, ``verdict`` (its text), ``divergences``,
        ``worst_rhat``, ``least_bulk_ess``, ``least_tail_ess``, ``polls_used``, ``last_fieldwork`` (ISO
        date), ``version``; ``stands_out`` where the task asked for it (see :func:`list_standing_out`); and,
        what differs from run to run, ``seconds`` (``build``, ``sampling``,
        ``all``) and ``reused_compilation``.
    """

    key: str
    data: xr.Dataset
    facts: Mapping[str, Any]


def build_data(inputs: DeskInputs, fit: Fit) -> xr.Dataset:
    """Thin and gather what is kept of a fit's draws; see :class:`FitRecord`."""
    thinned = fit.draws.isel({DRAW: slice(None, None, _stride(fit.draws))})
    data = xr.Dataset(
        {
            "national_support": _in_one_row(thinned["national_support"].isel({DATE: -1}, drop=True)),
            "national_support_polling_day": _in_one_row(thinned["national_support_polling_day"]),
            "support_polling_day": _in_one_row(thinned["support_polling_day"]),
            "expected_error": _expected_error(thinned, inputs.contest),
        }
    )
    seats = count_polling_day(
        inputs,
        draws=fit.draws[["support_polling_day", "turnout_weight"]],
        rng=np.random.default_rng([fit.settings.seed, SEATS_STREAM]),
    )
    if seats is not None:
        won = seats["seats_polling_day"].isel({DRAW: slice(None, None, _stride(fit.draws))})
        kept = seats[["seat_chance"]].drop_vars("seat_name", errors="ignore")
        data = data.merge(kept).assign(seats_polling_day=_in_one_row(won))
    for name in (PARTY, REGION, CODE):
        data[name] = data[name].astype(str)
    data.attrs = {}
    return data


def list_standing_out(inputs: DeskInputs, fit: Fit) -> list[str]:
    """Houses whose figures are not such as the fit would have expected; a blank stands for all together."""
    table = summarise_predictive(
        fit.parameters,
        arrays=fit.arrays,
        alliances=inputs.contest.alliances,
        rng=np.random.default_rng([fit.settings.seed, PREDICTIVE_STREAM]),
    )
    return [str(house) for house in table.loc[table["stands_out"] == "yes", "house"]]


def build_facts(inputs: DeskInputs, fit: Fit, *, asked: Mapping[str, Any]) -> dict[str, Any]:
    """Gather the facts of a fit that are the same whoever makes it.

    Parameters
    ----------
    asked
        Settings of the task.
    """
    found = fit.convergence
    return {
        "as_of": inputs.run_date.isoformat(),
        "polling_day": inputs.contest.last_polling_day.isoformat(),
        "seed": fit.settings.seed,
        "settings": dict(asked),
        "draws": fit.settings.draws,
        "target_accept": fit.settings.target_accept,
        "passed": fit.verdict.passed,
        "verdict": fit.verdict.text,
        "divergences": found.divergences,
        "worst_rhat": found.worst_rhat[1],
        "least_bulk_ess": found.least_bulk[1],
        "least_tail_ess": found.least_tail[1],
        "polls_used": int(inputs.polls["poll"].nunique()),
        "last_fieldwork": inputs.polls["end"].max().date().isoformat(),
        "version": program_version(),
    }


def _stride(draws: xr.Dataset) -> int:
    """Keep every so many draws of each chain."""
    return -(-draws.sizes[CHAIN] * draws.sizes[DRAW] // MOST_DRAWS)


def _in_one_row(array: xr.DataArray) -> xr.DataArray:
    """Lay the chains end to end: (chain, draw, …) to (draw, …)."""
    ordered = array.transpose(CHAIN, DRAW, ...)
    values = ordered.to_numpy()
    dims = (DRAW, *(d for d in ordered.dims if d not in (CHAIN, DRAW)))
    return xr.DataArray(
        values.reshape(-1, *values.shape[2:]), dims=dims, coords={d: ordered[d] for d in dims if d != DRAW}
    )


def _expected_error(draws: xr.Dataset, contest: Contest) -> xr.DataArray:
    alliances = [a for a in contest.alliances if a.active_on(contest.last_polling_day)]
    table = summarise_shelf_life(draws, sample=POLL_OF, ages=AGES, alliances=alliances)
    errors = table.pivot(index="age_days", columns="code", values="expected_error")
    codes = [*(str(p) for p in draws[PARTY].to_numpy()), *(a.code for a in alliances)]
    return xr.DataArray(errors[codes].to_numpy(), dims=(AGE, CODE), coords={AGE: np.array(AGES), CODE: codes})
