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

from models.dimensions import PARTY, SEAT

Float32Array = npt.NDArray[np.float32]
FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


@dataclass(frozen=True)
class LocalPriors:
    """Scales of the local swing, in log share.

    Attributes
    ----------
    slope_sd
        Standard deviation, over draws, of a party's slope on its last log share.
    noise_sd_median, noise_sd_log_sd
        Log-normal prior of a party's noise: median of its standard deviation and sd of the log.
    noise_degrees_of_freedom
        Degrees of freedom of the Student t noise; above 2, so that it has a standard deviation.
    """

    slope_sd: float = 0.12
    noise_sd_median: float = 0.15
    noise_sd_log_sd: float = 0.5
    noise_degrees_of_freedom: float = 5.0


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
    baseline: xr.Dataset, *, draws: int, rng: np.random.Generator, priors: LocalPriors | None = None
) -> LocalStrength:
    r"""Draw how far each seat strays from its region.

    .. math::

       \log F_{sp} = b_{sp} + \beta_p (b_{sp} - \bar b_{r(s)p}) + \epsilon_{sp} + u_{sp}

    with b the last log share, the slope :math:`\beta_p \sim N(0, 0.12^2)`, noise :math:`\epsilon` of a
    Student t distribution whose *standard deviation* is the party's drawn one, and u the extra spread where
    a party has no last votes.

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

    Returns
    -------
    LocalStrength
        ``strength`` (draw, party, seat) and ``region_deviation`` (draw, region, party).
    """
    priors = priors or LocalPriors()
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
        noise = _draw_noise(rng, draws=draws, seats=n_seats, priors=priors)
        deviation[:, :, party] = np.add.reduceat(noise * votes.astype(np.float32), start, axis=1)
        noise += base.astype(np.float32)
        noise += slope[:, None] * centred.astype(np.float32)
        unseen = np.flatnonzero(unseen_sd[party])
        noise[:, unseen] += unseen_sd[party, unseen] * rng.standard_normal((draws, unseen.size))
        strength[:, party] = np.where(stands, np.exp(noise), np.float32(0.0))
    return LocalStrength(strength=strength, region_deviation=deviation)


def region_starts(baseline: xr.Dataset) -> IntArray:
    """First seat of each region, and the number of seats at the end: the seats of region i stand between."""
    region = baseline["seat_region"].to_numpy()
    return np.append(np.flatnonzero(np.append(True, region[1:] != region[:-1])), region.size)


def _draw_noise(rng: np.random.Generator, *, draws: int, seats: int, priors: LocalPriors) -> Float32Array:
    """One party's noise (draw, seat): Student t, scaled to the standard deviation drawn for each draw."""
    degrees = priors.noise_degrees_of_freedom
    sd = priors.noise_sd_median * np.exp(priors.noise_sd_log_sd * rng.standard_normal(draws))
    noise = rng.standard_normal((draws, seats), dtype=np.float32)
    # z / sqrt(chi2 / degrees) has variance degrees / (degrees - 2); chi2 is twice a gamma variate.
    half_chi2 = rng.standard_gamma(degrees / 2, (draws, seats), dtype=np.float32)
    noise *= np.sqrt(np.float32((degrees - 2) / 2) / half_chi2)
    noise *= sd[:, None].astype(np.float32)
    return noise
