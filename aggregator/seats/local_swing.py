"""How seats stray from their region: strongholds, local noise, and what both do to a region.

A region's move is not the same in all its seats. In one draw a party may gain more where it was strong, or
where it was weak (the slope); and each seat has a way of its own (the noise, with heavy tails, because a
few seats always go astray). Both are drawn once per draw and serve every date, so that a series of seats
moves only when support does.

References
----------
Katz, J. N. and King, G. (1999). A statistical model for multiparty electoral data. American Political
Science Review 93, 15–32. doi:10.2307/2585758
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import xarray as xr

from aggregator.seats.local_noise import NO_CLUSTER, LocalNoise, LocalPriors, learn_local_noise
from models.dimensions import PARTY, SEAT

Float32Array = npt.NDArray[np.float32]
FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass(frozen=True)
class LocalStrength:
    """What a party's votes in a seat are proportional to, before the region is re-centred.

    Attributes
    ----------
    strength
        dims (draw, party, seat), positive; zero where the party does not stand. One constant factor per
        region and party is still free.
    region_deviation
        dims (draw, region, party), log units: what the noise of a region's own seats amounts to in the
        region.
    """

    strength: Float32Array
    region_deviation: FloatArray


def draw_local_strength(
    baseline: xr.Dataset,
    *,
    draws: int,
    rng: np.random.Generator,
    priors: LocalPriors | None = None,
    noise: LocalNoise | None = None,
) -> LocalStrength:
    r"""Draw how far each seat strays from its region.

    .. math::

       \log F_{sp} = b_{sp} + \beta_p (b_{sp} - \bar b_{r(s)p}) + \epsilon_{sp} + u_{sp}

    with b the last log share, the slope :math:`\beta_p \sim N(0, 0.12^2)`, noise :math:`\epsilon` of a
    Student t distribution whose *standard deviation* is the party's drawn one, and u the extra spread where
    a party has no last votes. Seats of one cluster share a part of the noise's variance, normal; a cluster
    that is a whole region shares none, since the region's own move is that already.

    Re-centring takes the mean of the noise out of a region, and would leave a region of one seat without
    any. So that mean, over the party's votes in the region, is returned beside the strength, to be added to
    the region's support: its sd is the noise sd over the root of the number of seats, and in a region of
    one seat it is that seat's noise.

    Parameters
    ----------
    baseline
        As `aggregator.seats.baseline.build_baseline` returns it: seats of one region stand together.
    draws
        Number of draws.
    rng
        Source of randomness; parties are drawn in the baseline's order.
    priors
        Scales of slope and noise.
    noise
        What was learned of the noise; the prior where None.

    Returns
    -------
    LocalStrength
        ``strength`` (draw, party, seat) and ``region_deviation`` (draw, region, party).
    """
    priors = priors or LocalPriors()
    noise = noise or learn_local_noise(baseline, before_last=None, priors=priors)
    cluster = _clusters(baseline)
    log_share = baseline["log_share"].transpose(PARTY, SEAT).to_numpy()
    unseen_sd = baseline["unseen_sd"].transpose(PARTY, SEAT).to_numpy()
    weight = baseline["weight"].to_numpy()
    start = region_starts(baseline)[:-1]
    seats_of_region = np.diff(region_starts(baseline))

    n_parties, n_seats = log_share.shape
    strength = np.empty((draws, n_parties, n_seats), dtype=np.float32)
    deviation = np.empty((draws, len(start), n_parties))
    for party in range(n_parties):
        stands = np.isfinite(log_share[party])
        base = np.where(stands, log_share[party], 0.0)
        centred = base - np.repeat(np.add.reduceat(weight * base, start), seats_of_region)
        votes = weight * np.exp(base)
        votes /= np.repeat(np.add.reduceat(votes, start), seats_of_region)

        slope = priors.slope_sd * rng.standard_normal(draws, dtype=np.float32)
        sd = np.exp(noise.log_sd[party] + noise.log_sd_sd[party] * rng.standard_normal(draws))
        stray = _draw_noise(rng, sd=sd, seats=n_seats, degrees=priors.noise_degrees_of_freedom)
        if cluster.max(initial=-1) >= 0:
            _share_noise(stray, sd=sd, cluster=cluster, part=noise.cluster_part, rng=rng)
        deviation[:, :, party] = np.add.reduceat(stray * votes.astype(np.float32), start, axis=1)
        stray += base.astype(np.float32)
        stray += slope[:, None] * centred.astype(np.float32)
        unseen = np.flatnonzero(unseen_sd[party])
        stray[:, unseen] += unseen_sd[party, unseen] * rng.standard_normal((draws, unseen.size))
        strength[:, party] = np.where(stands, np.exp(stray), np.float32(0.0))
    return LocalStrength(strength=strength, region_deviation=deviation)


def region_starts(baseline: xr.Dataset) -> IntArray:
    """First seat of each region, and the number of seats at the end: the seats of region i stand between."""
    region = baseline["seat_region"].to_numpy()
    return np.append(np.flatnonzero(np.append(True, region[1:] != region[:-1])), region.size)


def _clusters(baseline: xr.Dataset) -> IntArray:
    """Number of each seat's cluster, counted over regions; -1 where the seat shares its noise with none."""
    region = baseline["seat_region"].to_numpy()
    names = baseline["seat_cluster"].to_numpy()
    keys = np.char.add(np.char.add(region.astype(str), "\n"), names.astype(str))
    _, number, size = np.unique(keys, return_inverse=True, return_counts=True)
    _, of_region, seats_of_region = np.unique(region, return_inverse=True, return_counts=True)
    alone = (names == NO_CLUSTER) | (size[number] == seats_of_region[of_region])
    return np.where(alone, -1, number)


def _draw_noise(rng: np.random.Generator, *, sd: FloatArray, seats: int, degrees: float) -> Float32Array:
    """One party's noise (draw, seat): Student t, scaled to the standard deviation drawn for each draw."""
    noise = rng.standard_normal((sd.size, seats), dtype=np.float32)
    # z / sqrt(chi2 / degrees) has variance degrees / (degrees - 2); chi2 is twice a gamma variate.
    half_chi2 = rng.standard_gamma(degrees / 2, (sd.size, seats), dtype=np.float32)
    noise *= np.sqrt(np.float32((degrees - 2) / 2) / half_chi2)
    noise *= sd[:, None].astype(np.float32)
    return noise


def _share_noise(
    noise: Float32Array, *, sd: FloatArray, cluster: IntArray, part: float, rng: np.random.Generator
) -> None:
    """Put a part of the noise of each clustered seat in common, in place; its variance stays."""
    common = rng.standard_normal((sd.size, int(cluster.max()) + 1), dtype=np.float32)
    common *= (np.sqrt(part) * sd[:, None]).astype(np.float32)
    together = np.flatnonzero(cluster >= 0)
    noise[:, together] *= np.float32(np.sqrt(1 - part))
    noise[:, together] += common[:, cluster[together]]
