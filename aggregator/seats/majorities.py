"""Who is largest, who holds a majority, alone or only with allies, and how sure these chances are.

The outcomes, draw by draw:

largest
    the party with most seats. Parties that tie for most share the draw equally, so that the chances of all
    parties sum to one. Alliances do not enter: an alliance is no party.
majority alone
    the party holds at least the majority by itself.
majority only as an alliance
    the members of an alliance hold at least the majority together, and no party, member or not, holds it by
    itself.
no majority
    neither a party nor an alliance of the day holds it.

Others (``OTH``) are no party: they neither lead nor hold a majority. With a majority above half of the
chamber and alliances that share no member, exactly one of the last three kinds happens in every draw, to one
code.
"""

from __future__ import annotations

from collections.abc import Iterable
from datetime import date
from enum import StrEnum

import arviz as az
import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import OTHERS, Alliance, Contest
from models.dimensions import CHAIN, DATE, DRAW, PARTY

FloatArray = npt.NDArray[np.float64]

NO_CODE = ""


class Outcome(StrEnum):
    """What may happen in a chamber."""

    LARGEST = "largest"
    MAJORITY_ALONE = "majority_alone"
    MAJORITY_ONLY_AS_ALLIANCE = "majority_only_as_alliance"
    NO_MAJORITY = "no_majority"


def majority_line(contest: Contest, *, chamber: int) -> int:
    """Seats that make a majority: the contest's own number, or the smallest whole number above half."""
    return contest.counting.majority or chamber // 2 + 1


def summarise_majorities(seats: xr.Dataset, *, contest: Contest) -> pd.DataFrame:
    """Chances of every outcome, on every date and on polling day.

    Parameters
    ----------
    seats
        As `aggregator.seats.counting.count_seats` returns it: ``seats``, ``seats_polling_day`` and the
        attributes ``chamber`` and ``polling_day``.
    contest
        The contest: its alliances, each counted on the days on which it exists, and its majority.

    Returns
    -------
    pd.DataFrame
        Columns ``date`` (datetime64), ``kind`` (``on_date`` or ``on_polling_day``), ``outcome``, ``code``
        (empty for ``no_majority``), ``probability`` and ``mc_error``, 0–1. Dates in order, polling day last.
    """
    majority = majority_line(contest, chamber=int(seats.attrs["chamber"]))
    polling_day = date.fromisoformat(seats.attrs["polling_day"])
    tables = []
    for day in seats[DATE].values:
        when = pd.Timestamp(day)
        active = [a for a in contest.alliances if a.active_on(when.date())]
        table = chances_of_outcomes(seats["seats"].sel({DATE: day}), alliances=active, majority=majority)
        tables.append(table.assign(date=when, kind="on_date"))
    active = [a for a in contest.alliances if a.active_on(polling_day)]
    table = chances_of_outcomes(seats["seats_polling_day"], alliances=active, majority=majority)
    tables.append(table.assign(date=pd.Timestamp(polling_day), kind="on_polling_day"))
    columns = ["date", "kind", "outcome", "code", "probability", "mc_error"]
    return pd.concat(tables, ignore_index=True)[columns]


def chances_of_outcomes(seats: xr.DataArray, *, alliances: Iterable[Alliance], majority: int) -> pd.DataFrame:
    """Chances of every outcome on one day.

    Parameters
    ----------
    seats, alliances, majority
        As for `outcomes_in_draws`.

    Returns
    -------
    pd.DataFrame
        Columns ``outcome``, ``code``, ``probability``, ``mc_error``.
    """
    return pd.DataFrame(
        [
            (str(outcome), code, float(happens.mean()), monte_carlo_error(happens))
            for outcome, code, happens in outcomes_in_draws(seats, alliances=alliances, majority=majority)
        ],
        columns=["outcome", "code", "probability", "mc_error"],
    )


def outcomes_in_draws(
    seats: xr.DataArray, *, alliances: Iterable[Alliance], majority: int
) -> list[tuple[Outcome, str, FloatArray]]:
    """Whether each outcome happens, draw by draw.

    Parameters
    ----------
    seats
        Seats won on one day, dims (chain, draw, party), any order.
    alliances
        Alliances of the day.
    majority
        Seats that make a majority.

    Returns
    -------
    list of (outcome, code, happens)
        ``happens`` has dims (chain, draw): 1 where it happens, 0 where not, and for ``largest`` one part of
        k where k parties tie. The code of ``no_majority`` is empty.
    """
    seats = seats.transpose(CHAIN, DRAW, PARTY)
    won = seats.sel({PARTY: seats[PARTY] != OTHERS})
    parties = [str(code) for code in won[PARTY].values]
    most = won == won.max(PARTY)
    largest = most / most.sum(PARTY)
    alone = won >= majority
    nobody_alone = nobody = ~alone.any(PARTY)
    outcomes = [(Outcome.LARGEST, code, largest.sel({PARTY: code})) for code in parties]
    outcomes += [(Outcome.MAJORITY_ALONE, code, alone.sel({PARTY: code})) for code in parties]
    for alliance in alliances:
        together = seats.sel({PARTY: list(alliance.members)}).sum(PARTY) >= majority
        outcomes.append((Outcome.MAJORITY_ONLY_AS_ALLIANCE, alliance.code, together & nobody_alone))
        nobody = nobody & ~together
    outcomes.append((Outcome.NO_MAJORITY, NO_CODE, nobody))
    return [(outcome, code, happens.to_numpy().astype(np.float64)) for outcome, code, happens in outcomes]


def monte_carlo_error(happens: npt.ArrayLike) -> float:
    """Estimate the standard error of a probability read off draws, autocorrelation included.

    An outcome that happens in no draw (or in all) shows no variation to measure. Its error is taken as
    1 / (N + 2), about the standard deviation of the chance given N draws without the outcome and no
    knowledge before (Laplace's rule of succession).

    Parameters
    ----------
    happens
        dims (chain, draw): whether the outcome happens, or the part of it that does, 0–1.

    References
    ----------
    Vehtari, A., Gelman, A., Simpson, D., Carpenter, B. and Bürkner, P.-C. (2021). Rank-normalization,
    folding, and localization: an improved R-hat. Bayesian Analysis 16, 667–718. doi:10.1214/20-BA1221
    """
    indicator: FloatArray = np.asarray(happens, dtype=np.float64)
    if indicator.min() == indicator.max():
        return 1.0 / (indicator.size + 2)
    return float(az.mcse(indicator, method="mean"))
