"""Move the seats of a region together until their mean meets the region's support.

Polls speak of regions, not of seats. Multiplying a party's strength by one factor in all seats of a region
leaves the pattern between the seats as it is and shifts the level; the factors are found by repeating one
step: multiply each by support wanted over mean found. This is iterative proportional fitting of the table
seats x parties to the seats' weights and the region's shares.

References
----------
Deming, W. E. and Stephan, F. F. (1940). On a least squares adjustment of a sampled frequency table when the
expected marginal totals are known. Annals of Mathematical Statistics 11, 427–444.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from numba import njit, prange

from aggregator.seats.rules import Float32Array, IntArray, SeatVotes

# Largest accepted gap between a region's mean and its support: a fiftieth of the last published digit.
TOLERANCE = 2e-5
# Far more than is needed unless a party's votes stand in a few seats only; the gap left is reported.
MAX_STEPS = 200
# A party that stands never has exactly no support: so a factor can always recover.
_FLOOR = np.float32(1e-9)


@dataclass(frozen=True)
class Recentred:
    """The factors that make seats meet their region's support.

    Attributes
    ----------
    multiplier
        dims (draw, date, region, party).
    largest_gap
        Largest remaining gap between a region's mean and its support, share units, over everything.
    """

    multiplier: Float32Array
    largest_gap: float


def solve_multipliers(
    strength: Float32Array,
    *,
    support: Float32Array,
    weight: Float32Array,
    region_start: IntArray,
    tolerance: float = TOLERANCE,
    max_steps: int = MAX_STEPS,
) -> Recentred:
    r"""Solve for factors m with :math:`\sum_s w_s F_{sp} m_p / \sum_q F_{sq} m_q = \theta_p` in each region.

    Parameters
    ----------
    strength
        dims (draw, party, seat), the seats of one region together.
    support
        dims (draw, date, region, party), share 0–1; dates in order, since each starts from the one before.
    weight
        dims (seat): each seat's part of its region's votes, sum 1 in a region.
    region_start
        First seat of each region, then the number of seats.
    tolerance
        Largest accepted gap, share units.
    max_steps
        Most steps for one date.

    Returns
    -------
    Recentred
        The factors and the largest remaining gap.
    """
    multiplier, gap = _solve(
        strength,
        np.ascontiguousarray(support, dtype=np.float32),
        np.ascontiguousarray(weight, dtype=np.float32),
        region_start,
        np.float32(tolerance),
        max_steps,
    )
    return Recentred(multiplier=multiplier, largest_gap=float(gap.max(initial=0.0)))


def mean_shares(rows: SeatVotes, *, weight: npt.NDArray[np.float64]) -> Float32Array:
    """Mean share of each party over the seats of each region: dims (draw, date, region, party).

    Parameters
    ----------
    rows
        Votes by seat.
    weight
        dims (seat): each seat's part of its region's votes.
    """
    means: Float32Array = _mean(
        rows.strength,
        np.ascontiguousarray(rows.multiplier),
        np.ascontiguousarray(weight, dtype=np.float32),
        rows.region_start,
    )
    return means


@njit(parallel=True, cache=True, fastmath={"reassoc", "contract", "nsz", "arcp"})
def _mean(strength, multiplier, weight, region_start):  # type: ignore[no-untyped-def]
    means = np.empty(multiplier.shape, dtype=np.float32)
    for draw in prange(multiplier.shape[0]):
        for region in range(multiplier.shape[2]):
            first, last = region_start[region], region_start[region + 1]
            each = np.empty(last - first, dtype=np.float32)
            for date in range(multiplier.shape[1]):
                _region_mean(
                    strength[draw, :, first:last],
                    multiplier[draw, date, region],
                    weight[first:last],
                    each,
                    means[draw, date, region],
                )
    return means


# Sums may be reordered (the machine adds several seats at a time); NaN and infinity keep their meaning.
# Each draw is one thread's work from start to end: the number of threads changes nothing.
@njit(parallel=True, cache=True, fastmath={"reassoc", "contract", "nsz", "arcp"})
def _solve(strength, support, weight, region_start, tolerance, max_steps):  # type: ignore[no-untyped-def]
    n_draws, n_parties, _ = strength.shape
    n_dates, n_regions = support.shape[1], support.shape[2]
    multiplier = np.zeros((n_draws, n_dates, n_regions, n_parties), dtype=np.float32)
    gap = np.zeros(n_draws, dtype=np.float32)
    for draw in prange(n_draws):
        factor = np.empty(n_parties, dtype=np.float32)
        mean = np.empty(n_parties, dtype=np.float32)
        for region in range(n_regions):
            first, last = region_start[region], region_start[region + 1]
            here, part = strength[draw, :, first:last], weight[first:last]
            each = np.empty(last - first, dtype=np.float32)
            factor[:] = 1
            _region_mean(here, factor, part, each, mean)
            for date in range(n_dates):
                wanted = support[draw, date, region]
                miss = np.float32(0)
                for _ in range(max_steps):
                    for party in range(n_parties):
                        scale = max(wanted[party], _FLOOR) / mean[party] if mean[party] > 0 else 0
                        factor[party] *= scale
                    _region_mean(here, factor, part, each, mean)
                    miss = np.float32(0)
                    for party in range(n_parties):
                        miss = max(miss, abs(mean[party] - wanted[party]))
                    if miss <= tolerance:
                        break
                gap[draw] = max(gap[draw], miss)
                multiplier[draw, date, region] = factor
    return multiplier, gap


@njit(cache=True, fastmath={"reassoc", "contract", "nsz", "arcp"})
def _region_mean(strength, factor, part, each, mean):  # type: ignore[no-untyped-def]
    """Mean share of each party over the seats of a region, written into ``mean``.

    ``part`` is each seat's part of the region's votes; ``each``, room for one number per seat, takes that
    part per unit of strength.
    """
    each[:] = 0
    for party in range(factor.size):
        row = strength[party]
        for seat in range(each.size):
            each[seat] += row[seat] * factor[party]
    for seat in range(each.size):
        each[seat] = part[seat] / each[seat]
    for party in range(factor.size):
        row = strength[party]
        total = np.float32(0)
        for seat in range(each.size):
            total += row[seat] * each[seat]
        mean[party] = total * factor[party]
