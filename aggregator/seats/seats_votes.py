r"""How seats follow votes: what a code would hold with more or fewer votes, all else moving along.

A code's votes are multiplied by one factor in every seat, those of others shrink or grow to make room, and
the chamber is counted again, draw by draw (`aggregator.seats.counting.count_shifted`). Read against the
code's share of all votes, three things follow:

curve
    seats at each whole percent of the vote;
responsiveness
    seats per percentage point of the vote, about the vote the code has in the draw (Gelman & King's swing
    ratio, in seats): :math:`(S(v + h) - S(v - h)) / 2h`;
lead at equal votes
    seats of a code less those of its rival where both have equal votes: zero where the map favours neither.
    With two parties half of it, over the chamber, is the partisan bias.

References
----------
Kendall, M. G. and Stuart, A. (1950). The law of the cubic proportion in election results. British Journal of
Sociology 1, 183–196. doi:10.2307/588113
King, G. and Browning, R. X. (1987). Democratic representation and partisan bias in congressional elections.
American Political Science Review 81, 1251–1273. doi:10.2307/1962588
Gelman, A. and King, G. (1994). A unified method of evaluating electoral systems and redistricting plans.
American Journal of Political Science 38, 514–554. doi:10.2307/2111417
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import numpy.typing as npt
import xarray as xr

from models.dimensions import CHAIN, DRAW, PARTY

FloatArray = npt.NDArray[np.float64]

SHIFT = "shift"
"""Dim: multiplications of a code's votes; coordinates ``code``, ``against`` and ``log_factor``."""
VOTES = "votes"
"""Dim: share of all votes, 0–1."""
REACH = 0.10
"""How far the curve runs to either side of the expected vote, as a share of all votes."""
STEP = 0.01
HALF_WIDTH = 0.02
"""Responsiveness is taken over this much to either side: less would show the steps of single seats."""
STEPS_EACH_WAY = 16
_WIDER = 1.4
"""The country's vote moves by less than the logit of its mean, since its seats lie to both sides of that."""
_SMALLEST_VOTE = 1e-4
_STRAY = 0.005
"""Part of the draws at either end that need not come to the other end of the curve: there the count nearest
to it stands in."""


def plan_shifts(
    votes: xr.DataArray, *, codes: Mapping[str, Sequence[str]], pairs: Sequence[tuple[str, str]]
) -> xr.DataArray:
    """Plan by how much votes are multiplied, so that the draws get to both ends of each code's curve.

    Parameters
    ----------
    votes
        Share of the country's vote on polling day, dims (chain, draw, party), 0–1.
    codes
        Members of each code that gets a curve: a party, or the parties of an alliance.
    pairs
        Codes to be set at equal votes, two by two, without a member in common; both stand in ``codes``.

    Returns
    -------
    xr.DataArray
        Logs of factors, dims (shift, party), with the coordinates ``code``, ``against`` (the other code of a
        pair, empty in a curve) and ``log_factor`` (shift), which rises within each code and pair and is zero
        once.
    """
    share = {code: together(votes, members) for code, members in codes.items()}
    side = {
        code: votes[PARTY].isin(list(members)).to_numpy().astype(float) for code, members in codes.items()
    }
    factors, directions, labels = [], [], []
    for code in codes:
        low, high = _ends(share[code])
        least, most = np.quantile(share[code], [_STRAY, 1 - _STRAY])
        lowest = _WIDER * min(_logit(low) - _logit(most), -STEP)
        highest = _WIDER * max(_logit(high) - _logit(least), STEP)
        factors.append(_both_ways(lowest, highest))
        directions.append(side[code])
        labels.append((code, ""))
    for code, rival in pairs:
        # One gains what brings the other down, so each has to go half of the way.
        apart = np.log(np.maximum(share[code], _SMALLEST_VOTE) / np.maximum(share[rival], _SMALLEST_VOTE))
        reach = _WIDER * max(float(np.abs(apart).max()), STEP) / 2
        factors.append(_both_ways(-reach, reach))
        directions.append(side[code] - side[rival])
        labels.append((code, rival))
    every = np.concatenate(factors)
    counts = [len(steps) for steps in factors]
    return xr.DataArray(
        every[:, None] * np.repeat(directions, counts, axis=0),
        dims=(SHIFT, PARTY),
        coords={
            PARTY: votes[PARTY].to_numpy(),
            "code": (SHIFT, np.repeat([code for code, _ in labels], counts)),
            "against": (SHIFT, np.repeat([rival for _, rival in labels], counts)),
            "log_factor": (SHIFT, every),
        },
    )


def seats_at_votes(shifted: xr.Dataset, *, members: Sequence[str]) -> xr.DataArray:
    """Read the seats of a code at each whole percent of the vote, about the vote it is expected to have.

    Parameters
    ----------
    shifted
        ``seats`` and ``votes`` (draw, shift, party) of the shifts of this code's curve, with the coordinate
        ``log_factor``.
    members
        The parties whose votes and seats are added up.

    Returns
    -------
    xr.DataArray
        dims (votes, draw), seats; between the counts of two shifts in a straight line. The coordinate
        ``votes`` is a share, 0–1: those that the draws come to, a few far from the rest aside.
    """
    votes, seats = _path(shifted, members)
    low, high = _ends(votes_as_they_are(shifted, members=members))
    low = max(low, np.quantile(votes[:, 0], 1 - _STRAY))
    high = min(high, np.quantile(votes[:, -1], _STRAY))
    grid = STEP * np.arange(np.ceil(low / STEP - 1e-9), np.floor(high / STEP + 1e-9) + 1)
    read = np.array([_read_at(np.full(len(votes), vote), votes, seats) for vote in grid])
    return xr.DataArray(
        read.reshape(grid.size, len(votes)), dims=(VOTES, DRAW), coords={VOTES: np.round(grid, 10)}
    )


def responsiveness(shifted: xr.Dataset, *, members: Sequence[str]) -> FloatArray:
    """Seats per percentage point of the vote, about the vote each draw has: shape (draw,).

    Parameters
    ----------
    shifted, members
        As for :func:`seats_at_votes`.
    """
    votes, seats = _path(shifted, members)
    here = votes_as_they_are(shifted, members=members)
    below = np.maximum(here - HALF_WIDTH, votes[:, 0])
    above = np.minimum(here + HALF_WIDTH, votes[:, -1])
    gained = _read_at(above, votes, seats) - _read_at(below, votes, seats)
    return gained / (100.0 * (above - below))


def lead_at_equal_votes(
    shifted: xr.Dataset, *, members: Sequence[str], rivals: Sequence[str]
) -> tuple[FloatArray, FloatArray]:
    """Seats of a code less those of its rival where both have equal votes, and that vote.

    Parameters
    ----------
    shifted
        ``seats`` and ``votes`` (draw, shift, party) of the shifts of this pair, in their order.
    members, rivals
        The parties of the code and of its rival.

    Returns
    -------
    lead, vote
        Shape (draw,): seats, and the share of the vote that both then have, 0–1.
    """
    votes, seats = _path(shifted, members)
    their_votes, their_seats = _path(shifted, rivals)
    level = np.zeros(len(votes))
    return (
        _read_at(level, votes - their_votes, seats - their_seats),
        _read_at(level, votes - their_votes, votes),
    )


def votes_as_they_are(shifted: xr.Dataset, *, members: Sequence[str]) -> FloatArray:
    """Read the votes of some parties where nothing is shifted: share of all votes, shape (draw,)."""
    still = int(np.abs(shifted["log_factor"].to_numpy()).argmin())
    return together(shifted["votes"].isel({SHIFT: still}), members)


def together(values: xr.DataArray, members: Sequence[str]) -> FloatArray:
    """Sum over some parties, in the order of the other dims, as numbers of full precision."""
    held = values.sel({PARTY: list(members)}).sum(PARTY, dtype=np.float64)
    total: FloatArray = held.transpose(CHAIN, DRAW, SHIFT, missing_dims="ignore").to_numpy()
    return total


def _path(shifted: xr.Dataset, members: Sequence[str]) -> tuple[FloatArray, FloatArray]:
    """Votes and seats of some parties along the shifts, each (draw, shift)."""
    return together(shifted["votes"], members), together(shifted["seats"], members)


def _ends(share: FloatArray) -> tuple[float, float]:
    """First and last vote of a curve."""
    return max(share.mean() - REACH, STEP), min(share.mean() + REACH, 1 - STEP)


def _both_ways(lowest: float, highest: float) -> FloatArray:
    """Steps from below zero to above, zero among them."""
    down = np.linspace(lowest, 0.0, STEPS_EACH_WAY, endpoint=False)
    return np.concatenate([down, np.linspace(0.0, highest, STEPS_EACH_WAY + 1)])


def _logit(share: float) -> float:
    bounded = float(np.clip(share, _SMALLEST_VOTE, 1 - _SMALLEST_VOTE))
    return float(np.log(bounded / (1 - bounded)))


def _read_at(wanted: FloatArray, along: FloatArray, values: FloatArray) -> FloatArray:
    """Read each draw's ``values`` where ``along``, which rises, comes to ``wanted``: shape (draw,)."""
    after = np.clip((along < wanted[:, None]).sum(axis=1), 1, along.shape[1] - 1)[:, None]
    (x0, x1), (y0, y1) = (
        (np.take_along_axis(of, after - 1, axis=1)[:, 0], np.take_along_axis(of, after, axis=1)[:, 0])
        for of in (along, values)
    )
    width = x1 - x0
    part = np.clip((wanted - x0) / np.where(width > 0, width, 1.0), 0.0, 1.0)
    read: FloatArray = y0 + part * (y1 - y0)
    return read
