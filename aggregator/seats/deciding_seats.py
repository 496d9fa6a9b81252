r"""Which seats decide whether a party or an alliance has a majority.

Two readings, seat by seat. *Decides*: in each draw the seats of a code stand in the order of its lead there,
and the one with which it reaches the majority line is the seat that decides: hold it and all before it, and
there is a majority. *Carries*: the part of the variance of the code's seats that comes with one seat,

.. math:: \mathrm{cov}(w_s, \textstyle\sum_t w_t) \,/\, \mathrm{var}(\textstyle\sum_t w_t),

with w one where the seat is won. The parts of all seats add up to one. A seat that wavers on its own carries
p (1 - p) of it; one that goes with many others carries more than that.

Only seats that elect one member are looked at; what a code holds elsewhere is taken as it is in each draw.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from models.dimensions import CHAIN, DRAW, PARTY, SEAT

FloatArray = npt.NDArray[np.float64]

_WON = np.float32(4)
"""Leads run from -1 to 1: with this added a seat that is won stands before every seat that is not. Most votes
in a first round, or by a lot, do not always win."""


def single_member_seats(seats: xr.Dataset) -> npt.NDArray[np.bool_]:
    """Tell which seats elect one member, by position."""
    if "seat_magnitude" not in seats:
        return np.ones(seats.sizes[SEAT], dtype=bool)
    one: npt.NDArray[np.bool_] = seats["seat_magnitude"].to_numpy() == 1
    return one


def find_deciding_seats(
    seats: xr.Dataset,
    *,
    members: Sequence[str],
    majority: npt.ArrayLike,
    among: npt.NDArray[np.bool_] | None = None,
) -> xr.Dataset:
    """Find how often each seat is the one at the majority line, and what it carries.

    Parameters
    ----------
    seats
        Needs ``won`` and ``seat_votes`` (chain, draw, seat, party) and ``seats_polling_day`` (chain, draw,
        party), polling day.
    members
        The parties whose seats are added up: one party, or the members of an alliance. The lead of an
        alliance in a seat is that of its strongest member there over the strongest party outside.
    majority
        Seats that make a majority: one number, or dims (chain, draw).
    among
        Which seats to look at, shape (seat,); those of one member by default.

    Returns
    -------
    xr.Dataset
        dims (seat) of the seats looked at: ``chance`` of winning it, 0–1; ``decides``, part of the draws in
        which it stands at the line, and the sum of it below one where some draws have the line outside these
        seats; ``carries``, the part of the variance, NaN where there is none. ``stands`` (seat): whether any
        member does.
    """
    among = single_member_seats(seats) if among is None else among
    chosen = seats.isel({SEAT: np.flatnonzero(among)})
    won = _of_members(chosen["won"], members)
    total = seats["seats_polling_day"].sel({PARTY: list(members)}).sum(PARTY).transpose(CHAIN, DRAW)
    held = total.to_numpy().reshape(-1).astype(np.int64)
    line = np.broadcast_to(np.asarray(majority, dtype=np.int64), total.shape).reshape(-1)
    lead = _lead(chosen["seat_votes"], members)
    stands = np.isfinite(lead).any(axis=0)
    needed = line - (held - won.sum(axis=1, dtype=np.int64))
    return xr.Dataset(
        {
            "chance": ((SEAT,), won.mean(axis=0, dtype=np.float64)),
            "decides": ((SEAT,), _share_at_line(lead + _WON * won, needed)),
            "carries": ((SEAT,), _part_of_variance(won, held)),
            "stands": ((SEAT,), stands),
        },
        coords={SEAT: chosen[SEAT].to_numpy()},
    )


def _samples(array: xr.DataArray) -> npt.NDArray[Any]:
    """Values with chains and draws as one axis: shape (sample, seat, party)."""
    values = array.transpose(CHAIN, DRAW, SEAT, PARTY).to_numpy()
    return values.reshape(-1, *values.shape[2:])


def _of_members(won: xr.DataArray, members: Sequence[str]) -> npt.NDArray[np.int8]:
    """Whether any member wins, shape (sample, seat)."""
    values, place = _samples(won), won.get_index(PARTY)
    total = np.zeros(values.shape[:2], dtype=np.int8)
    for code in members:
        total += values[:, :, place.get_loc(code)]
    return total


def _lead(votes: xr.DataArray, members: Sequence[str]) -> npt.NDArray[np.float32]:
    """Lead of the strongest member over the strongest other: (sample, seat); -inf without a member."""
    values = _samples(votes)
    ours = np.zeros(values.shape[:2], dtype=np.float32)
    theirs = np.zeros_like(ours)
    # Party by party: a copy of a whole half of the votes would be the largest array of the run.
    for place, code in enumerate(votes[PARTY].to_numpy().tolist()):
        side = ours if code in members else theirs
        np.maximum(side, values[:, :, place], out=side)
    lead = ours - theirs
    lead[ours <= 0] = -np.inf
    return lead


def _share_at_line(order: npt.NDArray[np.float32], needed: npt.NDArray[np.int64]) -> FloatArray:
    """Part of the samples in which each seat is the ``needed``-th in descending order; 1 is the first."""
    ranked = np.argsort(-order, axis=1, kind="stable")
    within = (needed >= 1) & (needed <= np.isfinite(order).sum(axis=1))
    place = np.clip(needed - 1, 0, max(order.shape[1] - 1, 0))
    at_line = np.take_along_axis(ranked, place[:, None], axis=1)[:, 0]
    return np.bincount(at_line[within], minlength=order.shape[1]) / order.shape[0]


def _part_of_variance(won: npt.NDArray[np.int8], held: npt.NDArray[np.int64]) -> FloatArray:
    """Covariance of each seat with what is held, over the variance of that: shape (seat,)."""
    away = held - held.mean()
    variance = away @ away
    if variance <= 0:
        return np.full(won.shape[1], np.nan)
    # The deviations sum to zero, so that the mean of the seat need not be taken off.
    return np.asarray(away.astype(np.float32) @ won.astype(np.float32), dtype=np.float64) / variance
