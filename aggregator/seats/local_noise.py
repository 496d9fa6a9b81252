r"""How far seats stray from their region, and how much of it neighbours share: learned from two results.

Between two elections the log share of a party in a seat moves with its region, with its old share (the
slope), and by itself. What is left after region and slope is the seat's noise; its spread, and how alike it
is among the seats of a cluster, teach what to expect next time.

The spread of one pair of elections is not quite that of the next: that is allowed for by an extra log
standard deviation, an assumption.

References
----------
Katz, J. N. and King, G. (1999). A statistical model for multiparty electoral data. American Political
Science Review 93, 15–32. doi:10.2307/2585758
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr
from scipy import optimize, stats

from models.dimensions import PARTY, SEAT

FloatArray = npt.NDArray[np.float64]

NO_CLUSTER = ""


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
    between_elections_log_sd
        How much the noise of the next election may differ from that of the last, sd of its log.
    cluster_part
        Part of the noise variance that the seats of a cluster share, where nothing was learned of it.
    cluster_weight
        Number of pairs of seats that this part is worth when it is learned.
    incumbency, incumbency_sd
        Mean and standard deviation, over draws, of the pull of a sitting member who stands again.
    """

    slope_sd: float = 0.12
    noise_sd_median: float = 0.15
    noise_sd_log_sd: float = 0.5
    noise_degrees_of_freedom: float = 5.0
    between_elections_log_sd: float = 0.2
    cluster_part: float = 0.3
    cluster_weight: float = 50.0
    incumbency: float = 0.05
    incumbency_sd: float = 0.05


@dataclass(frozen=True)
class LocalNoise:
    """What is known of the local noise before the draws are made.

    Attributes
    ----------
    log_sd, log_sd_sd
        Normal distribution of the log of each party's noise sd, dims (party), in the baseline's order.
    seats
        Seats from which it was learned, dims (party); zero where it is the prior.
    cluster_part
        Part of the noise variance that the seats of a cluster share, 0–1.
    """

    log_sd: FloatArray
    log_sd_sd: FloatArray
    seats: npt.NDArray[np.int64]
    cluster_part: float


# Below this number of seats a party's spread says little, and regions and slope would eat most of it.
FEWEST_SEATS = 8
# A seat in which a party had under this share tells of few voters, not of where the party is strong.
SMALLEST_SHARE = 0.005
LEAST_RATIO = 0.4
GRID = np.linspace(np.log(0.01), np.log(1.5), 400)


def learn_local_noise(
    baseline: xr.Dataset, *, before_last: pd.DataFrame | None, priors: LocalPriors
) -> LocalNoise:
    """Learn the noise of each party from the last result and the one before it.

    Parameters
    ----------
    baseline
        As `aggregator.seats.baseline.build_baseline` returns it.
    before_last
        Votes of the election before the last: ``seat`` and one column per party; None without one.
    priors
        What holds where nothing is learned.

    Returns
    -------
    LocalNoise
        The prior where there is no earlier result, or too few seats with votes in both.
    """
    parties = baseline[PARTY].to_numpy()
    log_sd = np.full(parties.size, np.log(priors.noise_sd_median))
    log_sd_sd = np.full(parties.size, priors.noise_sd_log_sd)
    seats = np.zeros(parties.size, dtype=np.int64)
    if before_last is None:
        return LocalNoise(log_sd, log_sd_sd, seats, priors.cluster_part)
    residuals = stray_between(baseline, before_last)
    seen, seen_sd = log_sd.copy(), log_sd_sd.copy()
    for place, party in enumerate(parties):
        found = residuals[residuals["party"] == party]
        if len(found) >= FEWEST_SEATS:
            seen[place], seen_sd[place] = _spread(
                found["stray"].to_numpy(), degrees=priors.noise_degrees_of_freedom
            )
            seats[place] = len(found)
    told, told_sd = _undo_closure(seen, seen_sd, learned=seats > 0, baseline=baseline)
    weight = priors.noise_sd_log_sd**2 / (told_sd**2 + priors.noise_sd_log_sd**2)
    sd = np.hypot(np.sqrt(weight) * told_sd, priors.between_elections_log_sd)
    return LocalNoise(
        log_sd=np.where(seats > 0, weight * told + (1 - weight) * log_sd, log_sd),
        log_sd_sd=np.where(seats > 0, np.minimum(sd, priors.noise_sd_log_sd), log_sd_sd),
        seats=seats,
        cluster_part=_cluster_part(residuals, priors=priors),
    )


def stray_between(baseline: xr.Dataset, before_last: pd.DataFrame) -> pd.DataFrame:
    """How far each seat strayed from its region and from the slope between the last two elections.

    Parameters
    ----------
    baseline
        With ``last_share`` (seat, party), ``seat_region`` and ``seat_cluster``.
    before_last
        Votes of the election before: ``seat`` and one column per party.

    Returns
    -------
    pandas.DataFrame
        ``party``, ``seat``, ``region``, ``cluster``, ``stray`` (log units, scaled up for what regions and
        slope took), one row per party and seat with at least half a percent of the votes both times.
    """
    parties = [str(p) for p in baseline[PARTY].to_numpy()]
    votes = (
        before_last.assign(seat=before_last["seat"].astype(str)).set_index("seat").reindex(columns=parties)
    )
    share = votes.div(votes.sum(axis=1), axis=0).reindex(baseline[SEAT].to_numpy()).to_numpy(dtype=float)
    old, new = _log_share(share), _log_share(baseline["last_share"].transpose(SEAT, PARTY).to_numpy())
    region = baseline["seat_region"].to_numpy()
    moved = _centre(new - old, region, weight=_mean_share(baseline))
    slopes = _shared_slopes(moved, np.where(np.isnan(moved), np.nan, old), region, _mean_share(baseline))
    taken = _degrees_taken(moved, region)
    frames = [
        pd.DataFrame(
            {
                "party": party,
                "seat": baseline[SEAT].to_numpy()[seen],
                "region": region[seen],
                "cluster": baseline["seat_cluster"].to_numpy()[seen],
                "stray": (moved - slopes)[seen, place] * np.sqrt(seen.sum() / (seen.sum() - taken[place])),
            }
        )
        for place, party in enumerate(parties)
        if (seen := ~np.isnan(moved[:, place])).sum() > taken[place]
    ]
    columns = ["party", "seat", "region", "cluster", "stray"]
    return pd.concat(frames, ignore_index=True) if frames else pd.DataFrame(columns=columns)


def _log_share(share: FloatArray) -> FloatArray:
    """Log of a share; NaN where too few voted for the party."""
    enough = np.nan_to_num(share) >= SMALLEST_SHARE
    return np.where(enough, np.log(np.where(enough, share, 1.0)), np.nan)


def _mean_share(baseline: xr.Dataset) -> FloatArray:
    mean: FloatArray = np.nan_to_num(baseline["last_share"].transpose(SEAT, PARTY).to_numpy()).mean(axis=0)
    return mean / mean.sum()


def _centre(values: FloatArray, region: npt.NDArray[np.str_], *, weight: FloatArray) -> FloatArray:
    """Less each seat's weighted mean over parties, then less each region's mean by party; NaN stays.

    Shares sum to one: what one party gains in a seat all others lose there. A fixed mean over the parties
    takes that out exactly, in place of a sum that itself varies from seat to seat. A party's only seat in a
    region says nothing, and becomes NaN.
    """
    there = np.where(np.isnan(values), 0.0, weight)
    total = np.maximum(there.sum(axis=1, keepdims=True), np.finfo(float).tiny)
    frame = pd.DataFrame(values - (there * np.nan_to_num(values)).sum(axis=1, keepdims=True) / total)
    groups = frame.groupby(region)
    return (frame - groups.transform("mean")).where(groups.transform("count") > 1).to_numpy(dtype=float)


def _shared_slopes(
    moved: FloatArray, old: FloatArray, region: npt.NDArray[np.str_], weight: FloatArray
) -> FloatArray:
    """What the slopes of all parties explain of the moves, dims (seat, party), by least squares.

    One slope by party, on its own old log share; through the mean over parties it reaches the others' moves.
    """
    seen = ~np.isnan(moved)
    columns = []
    for place in range(old.shape[1]):
        alone = np.where(np.arange(old.shape[1]) == place, old, 0.0)
        columns.append(np.nan_to_num(_centre(np.where(seen, alone, np.nan), region, weight=weight))[seen])
    design = np.stack(columns, axis=1)
    slopes, *_ = np.linalg.lstsq(design, moved[seen], rcond=1e-9)
    explained = np.zeros_like(moved)
    explained[seen] = design @ slopes
    return explained


def _degrees_taken(moved: FloatArray, region: npt.NDArray[np.str_]) -> npt.NDArray[np.int64]:
    """Degrees of freedom that region means and a slope took from each party."""
    regions = pd.DataFrame(~np.isnan(moved)).groupby(region).any().sum().to_numpy(dtype=np.int64)
    return regions + 1


def _spread(stray: FloatArray, *, degrees: float) -> tuple[float, float]:
    """Mean and sd of the log of the noise sd, on a grid, for Student t noise and a flat prior."""
    scale = np.exp(GRID) * np.sqrt((degrees - 2) / degrees)
    density = stats.t.logpdf(stray[:, None] / scale, degrees).sum(axis=0) - len(stray) * np.log(scale)
    weight = np.exp(density - density.max())
    weight /= weight.sum()
    mean = float(weight @ GRID)
    return mean, float(np.sqrt(weight @ (GRID - mean) ** 2))


def _undo_closure(
    seen: FloatArray, seen_sd: FloatArray, *, learned: npt.NDArray[np.bool_], baseline: xr.Dataset
) -> tuple[FloatArray, FloatArray]:
    r"""Noise before shares are made to sum to one, from the noise that is seen in them: log sd, and its sd.

    What is seen strays by :math:`\epsilon_p - \sum_q w_q \epsilon_q`, w the mean shares: a large party by
    less than its own noise, a small one by some of the others'. So the squares are solved for, and the errors
    of all parties enter that of each.
    """
    weight = _mean_share(baseline)
    mixing = (np.eye(weight.size) - weight) ** 2
    square = np.exp(2 * seen)
    rest = mixing @ np.where(learned, 0.0, square)
    wanted = np.maximum(square - rest, 0.0)[learned]
    inner = mixing[np.ix_(learned, learned)]
    own, _ = optimize.nnls(inner, wanted)
    # A spread that the other parties explain wholly is not taken to be none.
    own = np.maximum(own, LEAST_RATIO**2 * square[learned])
    told, told_sd = seen.copy(), seen_sd.copy()
    told[learned] = np.log(own) / 2
    passed_on = np.linalg.pinv(inner) * square[learned] / own[:, None]
    told_sd[learned] = np.sqrt((passed_on * seen_sd[learned]) ** 2 @ np.ones(own.size))
    return told, told_sd


def _cluster_part(residuals: pd.DataFrame, *, priors: LocalPriors) -> float:
    """Part of the variance that neighbours share: mean product of pairs over mean square, and the prior."""
    named = residuals[residuals["cluster"] != NO_CLUSTER]
    if named.empty:
        return priors.cluster_part
    unit = named["stray"] / named.groupby("party")["stray"].transform(lambda s: np.sqrt((s**2).mean()))
    by_cluster = unit.groupby([named["party"], named["region"], named["cluster"]])
    products = (by_cluster.sum() ** 2 - (unit**2).groupby(
        [named["party"], named["region"], named["cluster"]]).sum()) / 2  # fmt: skip
    size = by_cluster.size()
    pairs = float((size * (size - 1) / 2).sum())
    together = priors.cluster_weight * priors.cluster_part + float(products.sum())
    return float(np.clip(together / (priors.cluster_weight + pairs), 0.0, 0.95))
