"""Who is largest, who holds a majority, alone or only with allies, and how sure these chances are.

The outcomes, draw by draw:

most support, largest
    the party with most votes, or with most seats. Parties that tie for most share the draw equally, so that
    the chances of all parties sum to one. Alliances do not enter: an alliance is no party.
majority alone
    the party holds at least the majority by itself.
majority only as an alliance
    the members of an alliance hold at least the majority together, and none of them holds it by itself.
no majority
    neither a party nor an alliance of the day holds it.

Others (``OTH``) are no party: they neither lead nor hold a majority. With a majority above half of the
chamber and alliances that share no member, exactly one of the last three kinds happens in every draw, to one
code.
"""

from __future__ import annotations

from collections.abc import Iterable
from enum import StrEnum
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr
from arviz_stats.base import array_stats

from aggregator.inputs.contest import OTHERS, Alliance, Contest
from models.dimensions import CHAIN, DRAW, PARTY

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]

NO_CODE = ""
FEWEST_DRAWS = 4
"""Draws of a chain below which its autocorrelation cannot be measured."""

REAL_CHANCE = 0.01
"""What is less likely than this is exceptionally unlikely on the IPCC's scale, and is not looked into."""


class Outcome(StrEnum):
    """What a chance is the chance of."""

    MOST_SUPPORT = "most_support"
    LARGEST = "largest"
    MAJORITY_ALONE = "majority_alone"
    MAJORITY_ONLY_AS_ALLIANCE = "majority_only_as_alliance"
    NO_MAJORITY = "no_majority"


type OutcomeInDraws = tuple[Outcome, str, FloatArray]
"""An outcome, its code, and whether it happens in each draw: shape (chain, draw), values 0 to 1."""


def majority_line(contest: Contest, *, chamber: npt.ArrayLike) -> IntArray:
    """Seats that make a majority: the contest's own number, or the smallest whole number above half.

    Parameters
    ----------
    contest
        May set a number of its own, which overhang seats do not move.
    chamber
        Seats in the chamber, any shape: one number by draw where overhang seats enlarge it.

    Returns
    -------
    numpy.ndarray
        Shape of ``chamber``.
    """
    size = np.asarray(chamber, dtype=np.int64)
    own = contest.counting.majority
    return size // 2 + 1 if own is None else np.full_like(size, own)


def leads_in_draws(held: xr.DataArray, *, outcome: Outcome) -> list[OutcomeInDraws]:
    """Whether each party holds most, draw by draw: one part of k where k parties tie.

    Parameters
    ----------
    held
        Support or seats on one day, dims (chain, draw, party), any order.
    outcome
        What holding most is called: ``MOST_SUPPORT`` or ``LARGEST``.

    Returns
    -------
    list of (outcome, code, happens)
        One per party, in the order of ``held``; ``happens`` has dims (chain, draw).
    """
    parties, values = parties_and_holdings(held)
    most = values == values.max(axis=-1, keepdims=True)
    parts = most / most.sum(axis=-1, keepdims=True)
    return [(outcome, code, parts[..., place]) for place, code in enumerate(parties)]


def majorities_in_draws(
    seats: xr.DataArray, *, alliances: Iterable[Alliance], majority: npt.ArrayLike
) -> list[OutcomeInDraws]:
    """Whether a majority is held alone, only as an alliance, or not at all, draw by draw.

    Parameters
    ----------
    seats
        Seats won on one day, dims (chain, draw, party), any order.
    alliances
        Alliances of the day.
    majority
        Seats that make a majority: one number, or dims (chain, draw) where the chamber's size differs.

    Returns
    -------
    list of (outcome, code, happens)
        ``happens`` has dims (chain, draw): 1 where it happens, 0 where not. The code of ``no_majority`` is
        empty.
    """
    parties, won = parties_and_holdings(seats)
    place = {code: index for index, code in enumerate(parties)}
    line = np.asarray(majority)
    alone = won >= line[..., None]
    somebody = alone.any(axis=-1)
    found = [(Outcome.MAJORITY_ALONE, code, alone[..., index]) for code, index in place.items()]
    for alliance in alliances:
        members = [place[member] for member in alliance.members]
        together = won[..., members].sum(axis=-1) >= line
        only_together = together & ~alone[..., members].any(axis=-1)
        found.append((Outcome.MAJORITY_ONLY_AS_ALLIANCE, alliance.code, only_together))
        somebody = somebody | together
    found.append((Outcome.NO_MAJORITY, NO_CODE, ~somebody))
    return [(outcome, code, happens.astype(np.float64)) for outcome, code, happens in found]


def codes_near_majority(
    seats: xr.DataArray, *, alliances: Iterable[Alliance], majority: npt.ArrayLike
) -> dict[str, tuple[str, ...]]:
    """Find the parties and alliances with a real chance of a majority, and their members.

    Parameters
    ----------
    seats, alliances, majority
        As for :func:`majorities_in_draws`.

    Returns
    -------
    dict
        Members by code, parties first: those that hold the majority in ``REAL_CHANCE`` of the draws or more,
        an alliance whether or not a member does so alone.
    """
    parties, won = parties_and_holdings(seats)
    line = np.asarray(majority)
    members = {code: (code,) for code in parties} | {each.code: each.members for each in alliances}
    return {
        code: of
        for code, of in members.items()
        if (won[..., [parties.index(m) for m in of]].sum(axis=-1) >= line).mean() >= REAL_CHANCE
    }


def parties_and_holdings(held: xr.DataArray) -> tuple[list[str], npt.NDArray[Any]]:
    """Codes of the parties, others left out, and what they hold: shape (chain, draw, party)."""
    codes = [str(code) for code in held[PARTY].values]
    parties = [code for code in codes if code != OTHERS]
    # Cut from the array itself: a labelled selection for every date would take most of the time.
    return parties, held.transpose(CHAIN, DRAW, PARTY).to_numpy()[..., [codes.index(p) for p in parties]]


def monte_carlo_error(happens: npt.ArrayLike) -> FloatArray:
    """Estimate the standard error of chances read off draws, autocorrelation included.

    An outcome that happens in no draw (or in all) shows no variation to measure, and a chain of fewer than
    ``FEWEST_DRAWS`` no autocorrelation. The error is then the standard deviation of the chance given the
    draws and Jeffreys' prior, about 0.7 / S for an outcome that never happens in S draws.

    Parameters
    ----------
    happens
        Shape (chain, draw, …): whether the outcome happens, or the part of it that does, 0 to 1.

    Returns
    -------
    numpy.ndarray
        Shape (…), no value zero.

    References
    ----------
    .. [1] Vehtari, A., Gelman, A., Simpson, D., Carpenter, B. and Bürkner, P.-C. (2021). Rank-normalization,
       folding, and localization: an improved R-hat. Bayesian Analysis 16, 667–718. doi:10.1214/20-BA1221
    .. [2] Brown, L. D., Cai, T. T. and DasGupta, A. (2001). Interval estimation for a binomial proportion.
       Statistical Science 16, 101–133. doi:10.1214/ss/1009213286
    """
    indicator: FloatArray = np.asarray(happens, dtype=np.float64)
    samples = indicator.shape[0] * indicator.shape[1]
    often = indicator.sum(axis=(0, 1))
    beta = (often + 0.5) * (samples - often + 0.5)
    error = np.asarray(np.sqrt(beta / (samples + 2.0)) / (samples + 1.0))
    varies = np.ptp(indicator, axis=(0, 1)) > 0
    if indicator.shape[1] >= FEWEST_DRAWS and varies.any():
        measured = array_stats.mcse(indicator[:, :, varies], chain_axis=0, draw_axis=1, method="mean")
        error[varies] = np.where(np.isfinite(measured), measured, error[varies])
    return error
