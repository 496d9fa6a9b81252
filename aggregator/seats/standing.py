"""Who stands in which seat, and the pull of a sitting member.

Polls ask all voters of a region, also where a party has no candidate. Where a party stands in the same seats
as last time its support was polled with that in mind: its seats share its support among them. Where its
slate has changed, its voters elsewhere find no candidate, and what it was polled there is lost to it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import OTHERS
from aggregator.seats.local_noise import LocalPriors
from aggregator.seats.local_swing import LocalStrength, region_starts
from aggregator.seats.rules import FloatArray, SeatVotes
from models.dimensions import PARTY, SEAT

BoolArray = npt.NDArray[np.bool_]

# What is assumed of a member who may or may not have sat already at the last election.
_MAY_HAVE_SAT = 0.5


@dataclass(frozen=True)
class Standing:
    """Where parties do not stand at the coming election.

    Attributes
    ----------
    same_slate
        dims (party, seat): absent, as it was last time in all of the region.
    changed
        dims (party, seat): absent, where the party's slate in the region is another than last time.
    """

    same_slate: BoolArray
    changed: BoolArray

    def before(self, local: LocalStrength) -> LocalStrength:
        """Take absent parties out of seats whose slate is the same: before regions meet their support."""
        if not self.same_slate.any():
            return local
        return replace(local, strength=np.where(self.same_slate, np.float32(0), local.strength))

    def after(self, rows: SeatVotes) -> SeatVotes:
        """Take absent parties out of all other seats: nothing is re-centred after that."""
        if not self.changed.any():
            return rows
        return replace(rows, strength=np.where(self.changed, np.float32(0), rows.strength))


def find_standing(candidates: pd.DataFrame | None, *, baseline: xr.Dataset) -> Standing:
    """Find where parties do not stand, and whether that is new.

    Parameters
    ----------
    candidates
        Candidates that stand: ``seat`` and ``code``. A seat that is not named has a full slate; others stand
        everywhere. None: all stand everywhere.
    baseline
        As `aggregator.seats.baseline.build_baseline` returns it.
    """
    parties, seats = baseline[PARTY].to_numpy(), baseline[SEAT].to_numpy()
    nobody = np.zeros((parties.size, seats.size), dtype=np.bool_)
    if candidates is None or candidates.empty:
        return Standing(nobody, nobody)
    stands = pd.crosstab(candidates["code"].astype(str), candidates["seat"].astype(str)) > 0
    named = np.isin(seats, stands.columns.to_numpy(dtype=str))
    listed = stands.reindex(index=parties, columns=seats, fill_value=False).to_numpy(dtype=np.bool_)
    absent = named & ~listed & (parties != OTHERS)[:, None]
    stood = baseline["last_share"].transpose(PARTY, SEAT).to_numpy() > 0
    same = _same_in_region(absent, stood, baseline)
    return Standing(same_slate=absent & same, changed=absent & ~same)


def _same_in_region(absent: BoolArray, stood: BoolArray, baseline: xr.Dataset) -> BoolArray:
    """Whether a party stands in some seats of a seat's region, and in the same as last time."""
    start = region_starts(baseline)
    changes = np.add.reduceat((absent == stood).astype(np.int64), start[:-1], axis=1)
    standing = np.add.reduceat((~absent).astype(np.int64), start[:-1], axis=1)
    same: BoolArray = np.repeat((changes == 0) & (standing > 0), np.diff(start), axis=1)
    return same


def pull_of_members(
    candidates: pd.DataFrame | None,
    *,
    baseline: xr.Dataset,
    before_last: pd.DataFrame | None,
    draws: int,
    priors: LocalPriors,
    rng: np.random.Generator,
) -> FloatArray | None:
    """Draw what sitting members who stand again, or do not, change since last time, in log share.

    A member who sat already at the last election brought the pull into the last result; one elected then
    brings it anew; a party whose member retires loses it. Whether the party held the seat before the last
    election is told by the result before it, and else counts as half.

    Parameters
    ----------
    candidates
        With ``seat``, ``code`` and ``holder``, whether the candidate is the sitting member.
    baseline
        As `aggregator.seats.baseline.build_baseline` returns it.
    before_last
        Votes of the election before the last, by seat; None without.
    draws, priors, rng
        Number of draws, size of the pull, source of randomness: one pull by draw.

    Returns
    -------
    numpy.ndarray or None
        dims (draw, party, seat); None where no candidate is a sitting member.
    """
    if candidates is None or not candidates["holder"].any():
        return None
    parties, seats = baseline[PARTY].to_numpy(), baseline[SEAT].to_numpy()
    named = np.isin(seats, candidates["seat"].astype(str).unique())
    holders = candidates[candidates["holder"]]
    sits = pd.crosstab(holders["code"].astype(str), holders["seat"].astype(str)) > 0
    stands_again = sits.reindex(index=parties, columns=seats, fill_value=False).to_numpy(dtype=float)
    last = baseline["last_share"].transpose(PARTY, SEAT).to_numpy()
    won_last = (last == last.max(axis=0)).astype(float)
    sat_before = won_last * _held_before(before_last, parties, seats)
    change = np.where(named, stands_again - sat_before, 0.0)
    pull = priors.incumbency + priors.incumbency_sd * rng.standard_normal(draws)
    return pull[:, None, None] * change


def _held_before(
    before_last: pd.DataFrame | None, parties: npt.NDArray[np.str_], seats: npt.NDArray[np.str_]
) -> FloatArray:
    """Whether each party won each seat before the last election: dims (party, seat); half if unknown."""
    if before_last is None:
        return np.full((parties.size, seats.size), _MAY_HAVE_SAT)
    votes = before_last.set_index(before_last["seat"].astype(str)).reindex(index=seats, columns=parties)
    cast = votes.fillna(0.0).to_numpy(dtype=float)
    known = cast.sum(axis=1) > 0
    won = (cast == cast.max(axis=1, keepdims=True)).astype(float)
    return np.where(known[:, None], won, _MAY_HAVE_SAT).T
