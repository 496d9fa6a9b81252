"""Where each seat starts: the last result, seat by seat, on a notional full slate.

A swing needs a starting share for every party that stands in a seat's region, also where it had no
candidate last time. There the party is given what it won elsewhere, and more spread, because nobody knows
how it would have done. Its level matters little: the seats of a region are later moved together until
their mean meets the region's support. What the baseline decides is how the party's votes are spread.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from models.dimensions import PARTY, SEAT

BoolArray = npt.NDArray[np.bool_]
FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True)
class BaselinePriors:
    """What is assumed about a party where it has no last votes.

    Attributes
    ----------
    newcomer_share
        Starting share of a party without last votes anywhere. Its size is of no consequence, since the
        region's support sets the level; it only has to be small and the same everywhere.
    unseen_sd
        Standard deviation, in log share, of the start of a party in a seat where it has no last votes:
        about the spread of a middling party's log shares between the seats of one region.
    """

    newcomer_share: float = 0.02
    unseen_sd: float = 0.5


def build_baseline(
    last_result: pd.DataFrame, *, contest: Contest, priors: BaselinePriors | None = None
) -> xr.Dataset:
    """Log shares at the last election, per seat and party, filled to a full slate.

    Seats are ordered by region and label and parties by code, so that whatever is computed or drawn from
    the baseline does not depend on the order of rows or columns in the desk's files.

    Parameters
    ----------
    last_result
        Votes, one row per seat: columns ``seat``, ``name``, ``region`` and one per party code; ``seats``, the
        members that the row elects (else one), and ``cluster`` (else none).
    contest
        The contest: its parties and where they stand.
    priors
        What is assumed where a party has no last votes.

    Returns
    -------
    xr.Dataset
        ``log_share`` (seat, party), ``-inf`` where the party does not stand in the region;
        ``unseen_sd`` (seat, party), log units, zero where the party has last votes;
        ``last_share`` (seat, party), 0–1, as counted; ``weight`` (seat), the seat's part of its region's
        votes; coordinates ``seat_name``, ``seat_region``, ``seat_cluster`` (blank: none) and
        ``seat_magnitude``, the members it elects.

    Raises
    ------
    ValueError
        Where the last result has one row per region and no seats.
    """
    if last_result["seat"].isna().any() or (last_result["seat"].astype(str).str.strip() == "").any():
        raise ValueError("The last result has rows without a seat: nothing can be counted in seats.")
    priors = priors or BaselinePriors()
    rows = last_result.sort_values(["region", "seat"], kind="stable")
    parties = sorted(contest.party_codes)
    votes = rows.reindex(columns=parties).fillna(0.0).to_numpy(dtype=np.float64)
    region = rows["region"].to_numpy(dtype=str)
    total = _seat_totals(votes, region)
    last_share = votes / total[:, None]
    stands = np.array([[contest.stands_in(p, r) for p in parties] for r in region])
    seen = votes > 0
    start = np.where(seen, last_share, _unseen_share(votes, total, region, priors.newcomer_share))
    return xr.Dataset(
        {
            "log_share": ((SEAT, PARTY), np.where(stands, np.log(start), -np.inf)),
            "unseen_sd": ((SEAT, PARTY), np.where(stands & ~seen, priors.unseen_sd, 0.0)),
            "last_share": ((SEAT, PARTY), last_share),
            "weight": ((SEAT,), total / _region_sum(total, region)),
        },
        coords={
            SEAT: rows["seat"].astype(str).to_numpy(dtype=str),
            PARTY: parties,
            "seat_name": (SEAT, rows["name"].astype(str).to_numpy(dtype=str)),
            "seat_region": (SEAT, region),
            "seat_cluster": (SEAT, _column(rows, "cluster", "").astype(str).to_numpy(dtype=str)),
            "seat_magnitude": (SEAT, _column(rows, "seats", 1).to_numpy(dtype=np.int64)),
        },
    )


def _column(rows: pd.DataFrame, name: str, otherwise: object) -> pd.Series:
    return rows[name] if name in rows else pd.Series([otherwise] * len(rows), index=rows.index)


def _seat_totals(votes: FloatArray, region: npt.NDArray[np.str_]) -> FloatArray:
    """Votes per seat; a seat without any (won unopposed) counts as the mean seat of its region."""
    total = votes.sum(axis=1)
    counted = total > 0
    mean = _region_sum(total, region) / np.maximum(_region_sum(counted.astype(float), region), 1)
    return np.where(counted, total, np.where(mean > 0, mean, 1.0))


def _unseen_share(
    votes: FloatArray, total: FloatArray, region: npt.NDArray[np.str_], newcomer_share: float
) -> FloatArray:
    """Share of each party over the seats where it had votes: of the region, else of the country."""
    seen = votes > 0

    def share(won: FloatArray, cast: FloatArray, otherwise: FloatArray | float) -> FloatArray:
        return np.where(won > 0, won / np.where(won > 0, cast, 1.0), otherwise)

    cast = np.where(seen, total[:, None], 0.0)
    country = share(votes.sum(axis=0), cast.sum(axis=0), newcomer_share)
    return share(_region_sum(votes, region), _region_sum(cast, region), country)


def _region_sum(values: FloatArray, region: npt.NDArray[np.str_]) -> FloatArray:
    """Sum over the seats of each seat's region: same shape as ``values``."""
    _, of_seat = np.unique(region, return_inverse=True)
    sums = np.zeros((of_seat.max() + 1, *values.shape[1:]))
    np.add.at(sums, of_seat, values)
    return sums[of_seat]
