"""From draws of support to draws of seats, by the rule or rules of the contest.

Votes are prepared first (`prepare`), then each group of regions is counted by its own rule. Expected seats
are sums of chances, never a count of leaders.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.inputs.counting_terms import CountingRule
from aggregator.seats.baseline import BaselinePriors
from aggregator.seats.list_count import count_by_lists
from aggregator.seats.local_noise import LocalPriors
from aggregator.seats.mixed import count_mixed_compensatory, count_mixed_parallel
from aggregator.seats.plurality import count_by_plurality
from aggregator.seats.prepare import PreparedGroup, PreparedSeats, prepare_seats
from aggregator.seats.recentring import mean_shares
from aggregator.seats.rules import CountSeats, FloatArray, IntArray, SeatArray, SeatsCounted
from aggregator.seats.swing_forms import SwingForm
from aggregator.seats.two_round import count_by_two_rounds
from models.dimensions import CHAIN, DATE, DRAW, PARTY, SEAT

COUNTING_RULES: dict[CountingRule, CountSeats] = {
    CountingRule.PLURALITY: count_by_plurality,
    CountingRule.TWO_ROUND: count_by_two_rounds,
    CountingRule.HIGHEST_AVERAGES: count_by_lists,
    CountingRule.LARGEST_REMAINDER: count_by_lists,
    CountingRule.MIXED_PARALLEL: count_mixed_parallel,
    CountingRule.MIXED_COMPENSATORY: count_mixed_compensatory,
}
SHIFT = "shift"


@dataclass(frozen=True)
class Chamber:
    """A counted chamber.

    Attributes
    ----------
    seats
        dims (draw, date, party).
    ties
        Counts decided by lot or by the rule for ties, dims (draw).
    last
        The count of each group, whose rows are of polling day.
    """

    seats: SeatArray
    ties: IntArray
    last: tuple[SeatsCounted, ...]


def count_seats(
    draws: xr.Dataset,
    *,
    last_result: pd.DataFrame,
    contest: Contest,
    rng: np.random.Generator,
    counted_result: pd.DataFrame | None = None,
    before_last: pd.DataFrame | None = None,
    transfers: pd.DataFrame | None = None,
    candidates: pd.DataFrame | None = None,
    form: SwingForm = SwingForm.LOG_RATIO,
    baseline_priors: BaselinePriors | None = None,
    local_priors: LocalPriors | None = None,
) -> xr.Dataset:
    """Count seats for every draw, on every date and on polling day.

    Parameters
    ----------
    draws
        Needs ``support`` (chain, draw, date, region, party) and ``support_polling_day`` (chain, draw,
        region, party), share 0–1, zero for a party that does not stand in a region; ``turnout_weight``
        (chain, draw, region) where it is known.
    last_result
        Votes at the last election, one row per seat or district: ``seat``, ``name``, ``region``, ``seats``,
        ``cluster``, one column per party.
    contest
        The contest: its parties, regions and counting rules.
    rng
        Source of randomness for slopes, local noise, lots and transfers.
    counted_result
        Votes of the regions that have been counted, in the same form; their seats are given, from their
        region's polling day on.
    before_last
        Votes at the election before the last, by seat: teaches how far seats stray from their region.
    transfers
        Rates at which voters move on in a run-off: ``from``, ``to``, ``rate``, ``sd``, percent.
    candidates
        Candidates that stand, one row each: ``seat``, ``code`` and ``holder``, whether it is the sitting
        member; None where every party stands wherever its region lets it.
    form
        How a region's move reaches its seats.
    baseline_priors, local_priors
        Scales of the local swing.

    Returns
    -------
    xr.Dataset
        ``seats`` (chain, draw, date, party) and ``seats_polling_day`` (chain, draw, party), int16: their sum
        is the chamber, and more where overhang seats are added. ``ties_broken`` (chain, draw): counts
        decided by lot or by the rule for ties, over all dates. Of polling day, where a rule is mixed:
        ``list_seats_polling_day`` (chain, draw, party), those that came from lists. Of polling day, where
        seats are filled in rows: ``won`` (chain, draw, seat, party), members elected, int8; ``seat_votes``
        (same dims), shares, float32; their means ``seat_expected`` and ``seat_share``, ``seat_chance`` of
        one member or more, and ``last_share`` (seat, party); coordinates ``seat_name``, ``seat_region`` and
        ``seat_magnitude``. Seats are in the order of ``last_result``, parties in that of ``draws``.
        Attributes: those of ``draws``, ``counting_rule``, ``chamber`` (regular number of seats) and
        ``recentring_gap`` (largest gap between a region's mean and its support, share units).

    Raises
    ------
    ValueError
        Where draws and last result do not fit each other: seats in a region without support, support for
        a party where it does not stand, rows without a seat.
    """
    prepared = prepare_seats(
        draws,
        last_result=last_result,
        contest=contest,
        rng=rng,
        counted_result=counted_result,
        before_last=before_last,
        transfers=transfers,
        candidates=candidates,
        form=form,
        baseline_priors=baseline_priors,
        local_priors=local_priors,
    )
    return count_prepared(
        prepared, draws=draws, contest=contest, order=last_result["seat"].astype(str).tolist()
    )


def count_prepared(
    prepared: PreparedSeats, *, draws: xr.Dataset, contest: Contest, order: Sequence[str]
) -> xr.Dataset:
    """Count a prepared chamber; see `count_seats`.

    Parameters
    ----------
    prepared
        The chamber.
    draws
        The draws it was prepared from.
    contest
        Says which joint lists there are on which day.
    order
        Labels of the seats, in the order wanted.
    """
    days = [pd.Timestamp(day).date() for day in draws[DATE].values]
    counted = count_chamber(prepared, contest=contest, days=[*days, contest.last_polling_day])
    shape = (draws.sizes[CHAIN], draws.sizes[DRAW])
    coords = {CHAIN: draws[CHAIN], DRAW: draws[DRAW], PARTY: list(prepared.parties)}
    seats = xr.DataArray(
        counted.seats.reshape(*shape, -1, len(prepared.parties)),
        dims=(CHAIN, DRAW, DATE, PARTY),
        coords=coords,
    )
    result = xr.Dataset(
        {
            "seats": seats.isel({DATE: slice(None, -1)}).assign_coords({DATE: draws[DATE]}),
            "seats_polling_day": seats.isel({DATE: -1}),
            "ties_broken": ((CHAIN, DRAW), counted.ties.reshape(shape)),
        },
        attrs={
            **draws.attrs,
            "counting_rule": "; ".join(dict.fromkeys(str(g.terms.terms.rule) for g in prepared.groups)),
            "chamber": prepared.chamber,
            "recentring_gap": prepared.recentring_gap,
        },
    )
    lists = [count.from_lists for count in counted.last if count.from_lists is not None]
    if lists:
        result["list_seats_polling_day"] = ((CHAIN, DRAW, PARTY), np.sum(lists, axis=0).reshape(*shape, -1))
    if prepared.baseline is not None:
        in_rows = set(prepared.baseline[SEAT].to_numpy().tolist())
        result = result.merge(_rows_of(prepared, counted, shape=shape)).sel(
            {SEAT: [label for label in order if label in in_rows]}
        )
    in_order = (CHAIN, DRAW, DATE, SEAT, PARTY)
    return result.reindex({PARTY: draws[PARTY]}).transpose(*in_order, missing_dims="ignore")


def count_shifted(
    prepared: PreparedSeats, *, shifts: npt.ArrayLike, contest: Contest, every: int = 1
) -> xr.Dataset:
    """Count polling day again with every seat's votes shifted, to see how seats follow votes.

    Parameters
    ----------
    prepared
        The chamber.
    shifts
        dims (shift, party), in the order of ``prepared.parties``: logs of the factors by which a party's
        votes are multiplied in every seat, before shares are taken again.
    contest
        Says which joint lists there are on polling day.
    every
        Use every so manieth draw.

    Returns
    -------
    xr.Dataset
        ``seats`` and ``votes`` (draw, shift, party): seats won, and share of the country's vote.
    """
    factor = np.exp(np.asarray(shifts, dtype=np.float64)).astype(np.float32)
    groups = [_shift_group(group, factor, weight=prepared.weight, every=every) for group in prepared.groups]
    shifted = replace(prepared, groups=tuple(groups))
    days = [contest.last_polling_day] * factor.shape[0]
    counted = count_chamber(shifted, contest=contest, days=days)
    by_shift = [sum(g.votes.votes_together(place) for g in groups) for place in range(factor.shape[0])]
    country = np.stack(by_shift, axis=1)
    country /= country.sum(axis=-1, keepdims=True)
    dims = (DRAW, SHIFT, PARTY)
    return xr.Dataset(
        {"seats": (dims, counted.seats), "votes": (dims, country)}, coords={PARTY: list(prepared.parties)}
    )


def _shift_group(
    group: PreparedGroup, factor: npt.NDArray[np.float32], *, weight: FloatArray, every: int
) -> PreparedGroup:
    """A group's polling day under every shift, shifts in the place of dates."""
    votes = group.votes
    rows, terms = votes.rows, group.terms
    if rows is not None:
        rows = replace(
            rows,
            strength=rows.strength[::every],
            multiplier=np.ascontiguousarray(rows.multiplier[::every, -1:] * factor[None, :, None]),
            lot=rows.lot[::every],
        )
        regional = mean_shares(rows, weight=weight[group.seats])
    else:
        regional = votes.region_votes[::every, -1:] * factor[None, :, None]
        regional /= regional.sum(axis=-1, keepdims=True)
    if terms.transfers is not None:
        terms = replace(terms, transfers=terms.transfers[::every])
    return replace(
        group,
        terms=terms,
        votes=replace(
            votes,
            rows=rows,
            region_votes=regional,
            turnout=votes.turnout[::every],
            list_lot=votes.list_lot[::every],
        ),
    )


def count_chamber(prepared: PreparedSeats, *, contest: Contest, days: Sequence[date]) -> Chamber:
    """Count every group on every day of its votes; the last is polling day, and joint lists are the day's."""
    groups = [_count_group(group, prepared.parties, contest=contest, days=days) for group in prepared.groups]
    seats = np.sum([g.seats for g in groups], axis=0, dtype=np.int16)
    ties: IntArray = np.sum([g.ties for g in groups], axis=0)
    return Chamber(seats=seats, ties=ties, last=tuple(groups))


def _count_group(
    group: PreparedGroup, parties: tuple[str, ...], *, contest: Contest, days: Sequence[date]
) -> SeatsCounted:
    """Count a group, day by day with the joint lists of that day; days with the same lists at once."""
    rule = COUNTING_RULES[group.terms.terms.rule]
    lists = [_joint_lists(contest, parties, day) for day in days]
    parts = []
    for joint in dict.fromkeys(lists):
        places = np.array([i for i, here in enumerate(lists) if here == joint], dtype=np.int64)
        votes = group.votes if len(places) == len(days) else group.votes.on_dates(places)
        parts.append((places, rule(votes, replace(group.terms, joint_lists=joint))))
    if len(parts) == 1:
        return parts[0][1]
    seats = np.empty((*group.votes.region_votes.shape[:2], len(parties)), dtype=np.int16)
    for places, counted in parts:
        seats[:, places] = counted.seats
    with_polling_day = next(counted for places, counted in parts if len(days) - 1 in places)
    ties: IntArray = np.sum([counted.ties for _, counted in parts], axis=0)
    return replace(with_polling_day, seats=seats, ties=ties)


def _joint_lists(contest: Contest, parties: tuple[str, ...], day: date) -> tuple[tuple[int, ...], ...]:
    return tuple(
        tuple(parties.index(member) for member in alliance.members)
        for alliance in contest.alliances
        if alliance.joint_list and alliance.active_on(day)
    )


def won_in_rows(prepared: PreparedSeats, counted: Chamber) -> npt.NDArray[np.signedinteger]:
    """Members that each row elects on polling day, dims (draw, seat, party), in the baseline's order."""
    baseline = prepared.baseline
    n_seats = 0 if baseline is None else baseline.sizes[SEAT]
    by_rows = [count.won for count in counted.last if count.won is not None]
    shape = (counted.seats.shape[0], n_seats, len(prepared.parties))
    won = np.zeros(shape, dtype=np.result_type(np.int8, *(w.dtype for w in by_rows)))
    for group, count in zip(prepared.groups, counted.last, strict=True):
        if count.won is not None:
            won[:, group.seats] = count.won
    return won


def _rows_of(prepared: PreparedSeats, counted: Chamber, *, shape: tuple[int, int]) -> xr.Dataset:
    """What is known seat by seat on polling day."""
    baseline = prepared.baseline
    if baseline is None:
        raise ValueError("Nothing is counted in rows.")
    won = won_in_rows(prepared, counted)
    share = np.zeros(won.shape, dtype=np.float32)
    for group in prepared.groups:
        if group.votes.rows is not None:
            share[:, group.seats] = group.votes.rows.polling_day_shares.transpose(0, 2, 1)
    by_draw = (CHAIN, DRAW, SEAT, PARTY)
    return xr.Dataset(
        {
            "won": (by_draw, won.reshape(*shape, *won.shape[1:])),
            "seat_votes": (by_draw, share.reshape(*shape, *won.shape[1:])),
            "seat_chance": ((SEAT, PARTY), (won > 0).mean(axis=0)),
            "seat_expected": ((SEAT, PARTY), won.mean(axis=0, dtype=np.float64)),
            "seat_share": ((SEAT, PARTY), share.mean(axis=0, dtype=np.float64)),
            "last_share": baseline["last_share"],
        },
        coords={name: baseline[name] for name in ("seat_name", "seat_region", "seat_magnitude")},
    )
