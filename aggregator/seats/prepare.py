"""Votes by seat, district and region, draw by draw and date by date: all that a count needs.

The order is that of the story: where seats start (`baseline`), how they stray from their region
(`local_swing`), and the move that makes a region's seats meet its support (`recentring`). Regions whose
lists are counted by region or over the country have no seats of their own, and need none of it.

References
----------
Curtice, J. and Firth, D. (2008). Exit polling in a cold climate. Journal of the Royal Statistical Society A
171, 509–539. doi:10.1111/j.1467-985X.2007.00536.x
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.inputs.counting_terms import MIXED_RULES, Across, CountingRule, CountingTerms
from aggregator.seats.baseline import BaselinePriors, build_baseline
from aggregator.seats.counted_seats import find_counted_seats, put_counts_in
from aggregator.seats.local_noise import LocalPriors, learn_local_noise
from aggregator.seats.local_swing import draw_local_strength, region_starts
from aggregator.seats.recentring import solve_multipliers
from aggregator.seats.rules import Float32Array, FloatArray, GroupTerms, GroupVotes, IntArray, SeatVotes
from aggregator.seats.standing import find_standing, pull_of_members
from aggregator.seats.swing_forms import SwingForm, add_points, priors_of_form
from aggregator.seats.transfers import draw_transfers
from models.dimensions import CHAIN, DATE, DRAW, PARTY, REGION, SEAT


@dataclass(frozen=True)
class PreparedGroup:
    """One group of regions, ready to be counted: its votes, its terms, and where its seats stand.

    Attributes
    ----------
    votes, terms
        What its rule is given.
    seats
        Positions of its seats in the baseline; empty where it fills none by rows.
    """

    votes: GroupVotes
    terms: GroupTerms
    seats: IntArray


@dataclass(frozen=True)
class PreparedSeats:
    """A chamber ready to be counted.

    Attributes
    ----------
    groups
        The groups of regions that count by different rules.
    baseline
        Seats and districts, as `aggregator.seats.baseline.build_baseline` returns them; None where no
        seats are filled in rows.
    weight
        Each row's part of its region's votes, dims (seat).
    parties, regions
        Codes in the order of the votes, both sorted.
    recentring_gap
        Largest gap between a region's mean and its support, share units.
    """

    groups: tuple[PreparedGroup, ...]
    baseline: xr.Dataset | None
    weight: FloatArray
    parties: tuple[str, ...]
    regions: tuple[str, ...]
    recentring_gap: float

    @property
    def chamber(self) -> int:
        """Regular number of seats: rows' members and list seats, without overhang."""
        return sum(regular_seats(group.terms) for group in self.groups)


def regular_seats(terms: GroupTerms) -> int:
    """Seats of a group: its rows' members and its list seats."""
    return int(terms.magnitude.sum() + terms.list_seats.sum())


def prepare_seats(
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
) -> PreparedSeats:
    """Prepare the votes of a chamber; for the parameters see `aggregator.seats.counting.count_seats`.

    Raises
    ------
    ValueError
        Where draws and last result do not fit each other, or uniform swing is asked for on more days than
        polling day.
    """
    parties, regions = tuple(sorted(contest.party_codes)), tuple(sorted(contest.region_codes))
    support = _support(draws, parties=parties, regions=regions)
    if form is SwingForm.ADDITIVE and support.shape[1] > 1:
        raise ValueError("Uniform swing is counted on polling day only.")
    in_rows = regions_with_rows(contest)
    places = np.array([regions.index(r) for r in in_rows], dtype=np.int64)
    rows = baseline = None
    weight, gap = np.empty(0), 0.0
    if in_rows:
        baseline = build_baseline(
            last_result[last_result["region"].isin(in_rows)], contest=contest, priors=baseline_priors
        )
        _check_standing(support[:, :, places], baseline, in_rows)
        rows, support[:, :, places], weight, gap = _draw_rows(
            support[:, :, places],
            baseline=baseline,
            voted=_voted(draws, contest, in_rows),
            rng=rng,
            counted_result=counted_result,
            before_last=before_last,
            candidates=candidates,
            form=form,
            priors=local_priors or LocalPriors(),
        )
    turnout = _turnout(draws, last_result, regions)
    list_lot = rng.random((support.shape[0], len(parties)))
    groups = group_votes(
        contest,
        rows=rows,
        baseline=baseline,
        support=support,
        turnout=turnout,
        list_lot=list_lot,
        last_result=last_result,
    )
    if transfers is not None:
        groups = tuple(_with_transfers(group, parties, transfers, rng=rng) for group in groups)
    return PreparedSeats(groups, baseline, weight, parties, regions, gap)


def group_votes(
    contest: Contest,
    *,
    rows: SeatVotes | None,
    baseline: xr.Dataset | None,
    support: Float32Array,
    turnout: FloatArray,
    list_lot: FloatArray,
    last_result: pd.DataFrame,
) -> tuple[PreparedGroup, ...]:
    """Deal the votes of a chamber out to the groups of regions that count alike.

    Parameters
    ----------
    contest
        Its groups.
    rows, baseline
        Votes of the seats and districts, regions sorted; None where no group fills any.
    support
        Share of each region's vote, dims (draw, date, region, party), regions and parties sorted.
    turnout
        Each region's part of the votes, dims (draw, region).
    list_lot
        dims (draw, party); see `aggregator.seats.rules.GroupVotes`.
    last_result
        Says how many members are elected where.
    """
    parties, regions = tuple(sorted(contest.party_codes)), tuple(sorted(contest.region_codes))
    places = np.array([regions.index(r) for r in regions_with_rows(contest)], dtype=np.int64)
    groups = []
    for terms, names in contest.counting_groups:
        of_group = np.array(sorted(regions.index(r) for r in names), dtype=np.int64)
        mine = np.searchsorted(places, of_group) if rows is not None and terms.elects_by_row else None
        votes = GroupVotes(
            rows=None if mine is None or rows is None else rows.of_regions(mine),
            region_votes=support[:, :, of_group],
            turnout=turnout[:, of_group],
            list_lot=list_lot,
        )
        seats = _seats_of(rows, mine)
        codes = [regions[r] for r in of_group]
        settled = _settle_terms(terms, contest, parties, codes, baseline, seats, last_result)
        groups.append(PreparedGroup(votes, settled, seats))
    return tuple(groups)


def regions_with_rows(contest: Contest) -> list[str]:
    """Regions whose rows elect somebody, sorted."""
    return sorted(r for terms, group in contest.counting_groups if terms.elects_by_row for r in group)


def _with_transfers(
    group: PreparedGroup, parties: tuple[str, ...], transfers: pd.DataFrame, *, rng: np.random.Generator
) -> PreparedGroup:
    """Draw the rates at which voters move on, where the group votes in two rounds."""
    if group.terms.terms.rule is not CountingRule.TWO_ROUND:
        return group
    draws = group.votes.turnout.shape[0]
    drawn = draw_transfers(transfers, parties=parties, draws=draws, rng=rng)
    return replace(group, terms=replace(group.terms, transfers=drawn))


def _draw_rows(
    support: Float32Array,
    *,
    baseline: xr.Dataset,
    voted: npt.NDArray[np.bool_],
    rng: np.random.Generator,
    counted_result: pd.DataFrame | None,
    before_last: pd.DataFrame | None,
    candidates: pd.DataFrame | None,
    form: SwingForm,
    priors: LocalPriors,
) -> tuple[SeatVotes, Float32Array, FloatArray, float]:
    """Votes by row; the support that they meet, (draw, date, region, party); their weights; the gap left."""
    n_draws, start = support.shape[0], region_starts(baseline)
    local = draw_local_strength(
        baseline,
        draws=n_draws,
        rng=rng,
        priors=priors_of_form(priors, form=form),
        noise=learn_local_noise(baseline, before_last=before_last, priors=priors),
    )
    if form is SwingForm.ADDITIVE:
        local = add_points(local, baseline=baseline, support=support[:, -1])
    pull = pull_of_members(
        candidates, baseline=baseline, before_last=before_last, draws=n_draws, priors=priors, rng=rng
    )
    if pull is not None:
        local = replace(local, strength=(local.strength * np.exp(pull)).astype(np.float32))
    standing = find_standing(candidates, baseline=baseline)
    local = standing.before(local)
    done = find_counted_seats(counted_result, baseline=baseline)
    local, weight = put_counts_in(local, weight=baseline["weight"].to_numpy(), counted=done)
    wanted = _with_region_deviation(support, local.region_deviation)
    recentred = solve_multipliers(
        local.strength, support=wanted, weight=weight.astype(np.float32), region_start=start
    )
    for region in done.region:
        # A count is no draw: no last digit of a re-centring may turn a narrow seat.
        recentred.multiplier[:, voted[:, region], region] = 1
    rows = SeatVotes(
        strength=local.strength,
        multiplier=recentred.multiplier,
        region_start=start,
        lot=rng.random((n_draws, baseline.sizes[SEAT]), dtype=np.float32),
    )
    return standing.after(rows), wanted, weight, recentred.largest_gap


def _support(draws: xr.Dataset, *, parties: tuple[str, ...], regions: tuple[str, ...]) -> Float32Array:
    """Support by date, polling day last: (draw, date, region, party)."""
    missing = sorted(set(regions) - set(draws[REGION].values.tolist()))
    if missing:
        raise ValueError(f"The contest has regions without support: {', '.join(missing)}.")
    if set(parties) != set(draws[PARTY].values.tolist()):
        raise ValueError("The parties of the draws are not those of the contest.")
    wanted = {REGION: list(regions), PARTY: list(parties)}
    by_date = draws["support"].sel(wanted).transpose(CHAIN, DRAW, DATE, REGION, PARTY).to_numpy()
    last = draws["support_polling_day"].sel(wanted).transpose(CHAIN, DRAW, REGION, PARTY).to_numpy()
    both = np.concatenate([by_date, last[:, :, None]], axis=2)
    return both.reshape(-1, *both.shape[2:]).astype(np.float32, copy=False)


def _check_standing(support: Float32Array, baseline: xr.Dataset, regions: Sequence[str]) -> None:
    start = region_starts(baseline)[:-1]
    found = baseline["seat_region"].to_numpy()[start].tolist()
    if found != list(regions):
        lost = ", ".join(sorted(set(regions) - set(found)))
        raise ValueError(f"The last result has no seat in {lost}.")
    absent = np.isneginf(baseline["log_share"].to_numpy()[start])
    if (support.max(axis=(0, 1)) > 0)[absent].any():
        raise ValueError("The draws give support to a party in a region where it does not stand.")


def _voted(draws: xr.Dataset, contest: Contest, regions: Sequence[str]) -> npt.NDArray[np.bool_]:
    """Whether a region had voted, dims (date, region), polling day last."""
    days = draws[DATE].to_numpy()
    by_region = [np.append(days >= np.datetime64(contest.polling_day_of(r)), True) for r in regions]
    return np.stack(by_region, axis=1)


def _with_region_deviation(support: Float32Array, deviation: FloatArray) -> Float32Array:
    """Support after the noise of the region's own seats: (draw, date, region, party)."""
    moved = support * np.exp(deviation)[:, None].astype(np.float32)
    moved /= moved.sum(axis=-1, keepdims=True)
    return moved


def _turnout(draws: xr.Dataset, last_result: pd.DataFrame, regions: tuple[str, ...]) -> FloatArray:
    """Each region's part of the votes: the model's, or the last result's, dims (draw, region)."""
    samples = draws.sizes[CHAIN] * draws.sizes[DRAW]
    if "turnout_weight" in draws:
        weight = draws["turnout_weight"].sel({REGION: list(regions)}).transpose(CHAIN, DRAW, REGION)
        return weight.to_numpy().reshape(samples, -1).astype(np.float64)
    codes = [c for c in draws[PARTY].values.tolist() if c in last_result]
    total = last_result.groupby("region")[codes].sum().sum(axis=1).reindex(list(regions)).to_numpy()
    return np.tile(total / total.sum(), (samples, 1))


def _seats_of(rows: SeatVotes | None, regions: IntArray | None) -> IntArray:
    """Positions of the seats of some regions among all rows."""
    if rows is None or regions is None:
        return np.empty(0, dtype=np.int64)
    start = rows.region_start
    return np.concatenate([np.arange(start[r], start[r + 1]) for r in regions])


def _settle_terms(
    terms: CountingTerms,
    contest: Contest,
    parties: tuple[str, ...],
    regions: Sequence[str],
    baseline: xr.Dataset | None,
    seats: IntArray,
    last_result: pd.DataFrame,
) -> GroupTerms:
    """Give the terms of a group of regions with its seats found; ``seats`` are positions in the baseline."""
    magnitude = np.empty(0, dtype=np.int64)
    if terms.elects_by_row and baseline is not None:
        magnitude = baseline["seat_magnitude"].to_numpy()[seats].astype(np.int64)
    list_seats = np.zeros(0, dtype=np.int64)
    if terms.rule in MIXED_RULES or not terms.elects_by_row:
        list_seats = _list_seats(terms, contest, regions, last_result)
    return GroupTerms(terms=terms, parties=parties, magnitude=magnitude, list_seats=list_seats)


def _list_seats(
    terms: CountingTerms, contest: Contest, regions: Sequence[str], last_result: pd.DataFrame
) -> IntArray:
    """Seats from lists, by region or in all."""
    stated = {region.code: region.list_seats for region in contest.regions}
    rows = last_result[last_result["region"].isin(regions)]
    members = rows["seats"].groupby(rows["region"]).sum() if "seats" in rows else pd.Series(dtype=int)
    if terms.across is Across.REGION:
        return np.array([stated.get(r) or int(members.get(r, 0)) for r in regions], dtype=np.int64)
    if terms.list_seats is not None:
        return np.array([terms.list_seats], dtype=np.int64)
    return np.array([int(members.sum()) or contest.counting.seats or 0], dtype=np.int64)
