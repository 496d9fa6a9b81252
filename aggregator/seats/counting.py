"""From draws of support to draws of seats.

The order is that of the story: where seats start (`baseline`), how they stray from their region
(`local_swing`), the move that makes a region's seats meet its support (`recentring`), and the count by the
contest's rule (`plurality`). Expected seats are sums of chances, never a count of leaders.

References
----------
Curtice, J. and Firth, D. (2008). Exit polling in a cold climate. Journal of the Royal Statistical Society A
171, 509–539. doi:10.1111/j.1467-985X.2007.00536.x
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.errors import UsageError
from aggregator.inputs.contest import Contest, CountingRule
from aggregator.seats.baseline import BaselinePriors, build_baseline
from aggregator.seats.counted_seats import find_counted_seats, put_counts_in
from aggregator.seats.local_swing import LocalPriors, draw_local_strength, region_starts
from aggregator.seats.plurality import count_by_plurality
from aggregator.seats.recentring import solve_multipliers
from aggregator.seats.rules import CountSeats, SeatVotes
from models.dimensions import CHAIN, DATE, DRAW, PARTY, REGION, SEAT

COUNTING_RULES: dict[CountingRule, CountSeats] = {CountingRule.PLURALITY: count_by_plurality}


def count_seats(
    draws: xr.Dataset,
    *,
    last_result: pd.DataFrame,
    contest: Contest,
    rng: np.random.Generator,
    counted_result: pd.DataFrame | None = None,
    baseline_priors: BaselinePriors | None = None,
    local_priors: LocalPriors | None = None,
) -> xr.Dataset:
    """Count seats for every draw, on every date and on polling day.

    Parameters
    ----------
    draws
        Needs ``support`` (chain, draw, date, region, party) and ``support_polling_day`` (chain, draw,
        region, party), share 0–1, zero for a party that does not stand in a region.
    last_result
        Votes at the last election, one row per seat: ``seat``, ``name``, ``region``, one column per party.
    contest
        The contest: its parties, regions and counting rule.
    rng
        Source of randomness for slopes, local noise and lots.
    counted_result
        Votes of the regions that have been counted, in the same form; their seats are given, from their
        region's polling day on.
    baseline_priors, local_priors
        Scales of the local swing.

    Returns
    -------
    xr.Dataset
        ``seats`` (chain, draw, date, party) and ``seats_polling_day`` (chain, draw, party), int16;
        ``seat_chance``, ``seat_share`` and ``last_share`` (seat, party), 0–1, the first two on polling day;
        coordinates ``seat_name`` and ``seat_region``. Seats are in the order of ``last_result``, parties in
        that of ``draws``. Attributes: those of ``draws``, ``counting_rule``, ``chamber`` (number of seats)
        and ``recentring_gap`` (largest gap between a region's mean and its support, share units).

    Raises
    ------
    UsageError
        Where the contest's counting rule is not available.
    ValueError
        Where draws and last result do not fit each other: seats in a region without support, support for
        a party where it does not stand, rows without a seat.
    """
    rule = COUNTING_RULES.get(contest.counting.rule)
    if rule is None:
        known = ", ".join(COUNTING_RULES)
        raise UsageError(f"Counting rule {contest.counting.rule} is not available; available: {known}.")
    baseline = build_baseline(last_result, contest=contest, priors=baseline_priors)
    support = _support_of_seat_regions(draws, baseline)
    n_draws = support.shape[0]
    local = draw_local_strength(baseline, draws=n_draws, rng=rng, priors=local_priors)
    start = region_starts(baseline)
    done = find_counted_seats(counted_result, baseline=baseline)
    local, weight = put_counts_in(local, weight=baseline["weight"].to_numpy(), counted=done)
    recentred = solve_multipliers(
        local.strength,
        support=_with_region_deviation(support, local.region_deviation),
        weight=weight.astype(np.float32),
        region_start=start,
    )
    for region in done.region:
        # A count is no draw: no last digit of a re-centring may turn a narrow seat.
        recentred.multiplier[:, _since_voting(draws, baseline, contest, region), region] = 1
    votes = SeatVotes(
        strength=local.strength,
        multiplier=recentred.multiplier,
        region_start=start,
        lot=rng.random((n_draws, baseline.sizes[SEAT]), dtype=np.float32),
    )
    counted = rule(votes)
    seats = xr.DataArray(
        counted.seats.reshape(draws.sizes[CHAIN], draws.sizes[DRAW], -1, baseline.sizes[PARTY]),
        dims=(CHAIN, DRAW, DATE, PARTY),
        coords={CHAIN: draws[CHAIN], DRAW: draws[DRAW], PARTY: baseline[PARTY]},
    )
    result = xr.Dataset(
        {
            "seats": seats.isel({DATE: slice(None, -1)}).assign_coords({DATE: draws[DATE]}),
            "seats_polling_day": seats.isel({DATE: -1}),
            "seat_chance": ((SEAT, PARTY), counted.chance),
            "seat_share": ((PARTY, SEAT), votes.polling_day_shares.mean(axis=0, dtype=np.float64)),
            "last_share": baseline["last_share"],
        },
        attrs={
            **draws.attrs,
            "counting_rule": str(contest.counting.rule),
            "chamber": baseline.sizes[SEAT],
            "recentring_gap": recentred.largest_gap,
        },
    )
    return (
        result.sel({SEAT: last_result["seat"].astype(str).to_numpy(dtype=str)})
        .reindex({PARTY: draws[PARTY]})
        .transpose(CHAIN, DRAW, DATE, SEAT, PARTY)
    )


def _since_voting(
    draws: xr.Dataset, baseline: xr.Dataset, contest: Contest, region: int
) -> npt.NDArray[np.bool_]:
    """Whether a region had voted, by date, polling day last."""
    name = str(baseline["seat_region"].to_numpy()[region_starts(baseline)[region]])
    voted = draws[DATE].to_numpy() >= np.datetime64(contest.polling_day_of(name))
    return np.append(voted, True)


def _support_of_seat_regions(draws: xr.Dataset, baseline: xr.Dataset) -> npt.NDArray[np.float32]:
    """Support by date, polling day last, for the regions that have seats: (draw, date, region, party)."""
    regions = baseline["seat_region"].to_numpy()[region_starts(baseline)[:-1]]
    missing = sorted(set(regions) - set(draws[REGION].values.tolist()))
    if missing:
        raise ValueError(f"The last result has seats in regions without support: {', '.join(missing)}.")
    if set(baseline[PARTY].values.tolist()) != set(draws[PARTY].values.tolist()):
        raise ValueError("The parties of the draws are not those of the contest.")
    wanted = {REGION: regions, PARTY: baseline[PARTY].to_numpy()}
    by_date = draws["support"].sel(wanted).transpose(CHAIN, DRAW, DATE, REGION, PARTY).to_numpy()
    last = draws["support_polling_day"].sel(wanted).transpose(CHAIN, DRAW, REGION, PARTY).to_numpy()
    both = np.concatenate([by_date, last[:, :, None]], axis=2)
    support = both.reshape(-1, *both.shape[2:])
    absent = np.isneginf(baseline["log_share"].to_numpy()[region_starts(baseline)[:-1]])
    if (support.max(axis=(0, 1)) > 0)[absent].any():
        raise ValueError("The draws give support to a party in a region where it does not stand.")
    return support


def _with_region_deviation(
    support: npt.NDArray[np.float32], deviation: npt.NDArray[np.float64]
) -> npt.NDArray[np.float32]:
    """Support after the noise of the region's own seats: (draw, date, region, party)."""
    moved = support * np.exp(deviation)[:, None].astype(np.float32)
    moved /= moved.sum(axis=-1, keepdims=True)
    return moved
