"""Seats of regions that have voted and been counted: no estimate, but the count.

From its polling day on such a region's seats are those its votes give, in every draw. Before that day they
are the same seats moved back with the region's support.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.seats.local_swing import LocalStrength, region_starts
from models.dimensions import PARTY, SEAT

# A party without votes in a seat keeps a trace there, in votes: before polling day its region may still
# support it.
_TRACE = 0.01


@dataclass(frozen=True)
class CountedSeats:
    """Seats whose votes are known.

    Attributes
    ----------
    votes
        Votes, dims (counted seat, party), in the baseline's order of parties.
    weight
        Each seat's part of its region's votes, dims (counted seat).
    place
        Position of each counted seat in the baseline, dims (counted seat).
    region
        Positions of the counted regions among the baseline's, dims (counted region).
    """

    votes: npt.NDArray[np.float64]
    weight: npt.NDArray[np.float64]
    place: npt.NDArray[np.int64]
    region: npt.NDArray[np.int64]


def find_counted_seats(counted_result: pd.DataFrame | None, *, baseline: xr.Dataset) -> CountedSeats:
    """Match the count with the baseline's seats; empty without any count.

    Parameters
    ----------
    counted_result
        Votes, one row per seat of the counted regions: ``seat``, ``region`` and one column per party.
    baseline
        As :func:`aggregator.seats.baseline.build_baseline` returns it.
    """
    seats, parties = baseline[SEAT].to_numpy(), baseline[PARTY].to_numpy()
    names = baseline["seat_region"].to_numpy()[region_starts(baseline)[:-1]]
    if counted_result is None or counted_result.empty:
        nothing = np.empty(0, dtype=np.int64)
        return CountedSeats(np.empty((0, len(parties))), np.empty(0), nothing, nothing)
    rows = counted_result.assign(seat=counted_result["seat"].astype(str)).set_index("seat")
    place = np.flatnonzero(np.isin(seats, rows.index.to_numpy(dtype=str)))
    rows = rows.loc[seats[place]]
    votes = rows.reindex(columns=parties).fillna(0.0).to_numpy(dtype=np.float64)
    total = pd.Series(votes.sum(axis=1))
    region = rows["region"].to_numpy(dtype=str)
    return CountedSeats(
        votes=votes,
        weight=(total / total.groupby(region).transform("sum")).to_numpy(),
        place=place,
        region=np.flatnonzero(np.isin(names, region)),
    )


def put_counts_in(
    local: LocalStrength, *, weight: npt.NDArray[np.float64], counted: CountedSeats
) -> tuple[LocalStrength, npt.NDArray[np.float64]]:
    """Replace drawn strengths by counted votes, the same in every draw; the seats' weights with them.

    Whole numbers of votes stay exact in single precision up to sixteen million in a seat.
    """
    if not counted.place.size:
        return local, weight
    strength, deviation, weight = local.strength.copy(), local.region_deviation.copy(), weight.copy()
    known = np.where(counted.votes > 0, counted.votes, _TRACE)
    stands = local.strength[:1, :, counted.place] > 0
    strength[:, :, counted.place] = np.where(stands, known.T.astype(np.float32), np.float32(0))
    deviation[:, counted.region] = 0.0
    weight[counted.place] = counted.weight
    return LocalStrength(strength=strength, region_deviation=deviation), weight
