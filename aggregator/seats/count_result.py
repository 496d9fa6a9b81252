"""Seats of a result that is known: the votes counted by the contest's rules, as they stand."""

from __future__ import annotations

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.inputs.counting_terms import CountingRule
from aggregator.seats.baseline import build_baseline
from aggregator.seats.counting import count_chamber, won_in_rows
from aggregator.seats.local_swing import region_starts
from aggregator.seats.prepare import PreparedSeats, group_votes, regions_with_rows
from aggregator.seats.rules import SeatVotes
from models.dimensions import PARTY, SEAT


def votes_say_seats(contest: Contest) -> bool:
    """Tell whether the votes of a result decide the seats: those of a first round alone do not."""
    rules = {terms.rule for terms, _ in contest.counting_groups}
    return not rules & {CountingRule.TWO_ROUND, CountingRule.NONE}


def count_result(votes: pd.DataFrame, *, contest: Contest) -> xr.Dataset:
    """Count the seats of a result.

    Parameters
    ----------
    votes
        Votes, one row per seat, district or region: ``seat``, ``name``, ``region``, ``seats`` (members; else
        one) and one column per party, NaN where it did not stand.
    contest
        The contest whose rules it is counted by.

    Returns
    -------
    xr.Dataset
        ``seats`` (party): the whole chamber; ``ties``: counts that a lot has to decide, for which the seats
        given are one way it can fall. Where rows elect members, ``won`` (seat, party).

    Raises
    ------
    ValueError
        If a first round leaves seats undecided.
    """
    if not votes_say_seats(contest):
        raise ValueError("The votes of a first round do not say who won the second.")
    prepared = _prepare(votes, contest)
    counted = count_chamber(prepared, contest=contest, days=[contest.last_polling_day])
    result = xr.Dataset(
        {"seats": ((PARTY,), counted.seats[0, 0]), "ties": int(counted.ties[0])},
        coords={PARTY: list(prepared.parties)},
    )
    if prepared.baseline is not None:
        result = result.assign_coords({SEAT: prepared.baseline[SEAT].to_numpy()})
        result["won"] = ((SEAT, PARTY), won_in_rows(prepared, counted)[0])
    return result


def _prepare(votes: pd.DataFrame, contest: Contest) -> PreparedSeats:
    """One draw on one day: the votes as they are."""
    parties, regions = tuple(sorted(contest.party_codes)), tuple(sorted(contest.region_codes))
    cast = votes.reindex(columns=list(parties)).fillna(0.0).to_numpy(dtype=np.float64)
    by_region = np.stack([cast[(votes["region"] == r).to_numpy()].sum(axis=0) for r in regions])
    turnout = (by_region.sum(axis=1) / by_region.sum())[None]
    share = (by_region / by_region.sum(axis=1, keepdims=True)).astype(np.float32)
    baseline = rows = None
    if in_rows := regions_with_rows(contest):
        baseline = build_baseline(votes[votes["region"].isin(in_rows)], contest=contest)
        rows = _rows(votes, baseline, parties)
    groups = group_votes(
        contest,
        rows=rows,
        baseline=baseline,
        support=share[None, None],
        turnout=turnout,
        list_lot=np.linspace(0, 1, len(parties))[None],
        last_result=votes,
    )
    weight = np.empty(0) if baseline is None else baseline["weight"].to_numpy()
    return PreparedSeats(groups, baseline, weight, parties, regions, 0.0)


def _rows(votes: pd.DataFrame, baseline: xr.Dataset, parties: tuple[str, ...]) -> SeatVotes:
    """Whole votes by row, in the baseline's order."""
    by_seat = votes.set_index(votes["seat"].astype(str)).loc[baseline[SEAT].to_numpy()]
    cast = by_seat.reindex(columns=list(parties)).fillna(0.0).to_numpy(dtype=np.float32)
    start = region_starts(baseline)
    return SeatVotes(
        strength=np.ascontiguousarray(cast.T[None]),
        multiplier=np.ones((1, 1, start.size - 1, len(parties)), dtype=np.float32),
        region_start=start,
        lot=np.zeros((1, len(by_seat)), dtype=np.float32),
    )
