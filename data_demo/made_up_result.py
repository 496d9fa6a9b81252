"""Polling day of an invented election: votes, seat by seat."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from data_demo.made_up_counting import draw_transfers
from data_demo.made_up_country import Country, handed_on, log_softmax, softmax
from data_demo.made_up_local_noise import draw_local_noise, draw_local_sd

TURNOUT_NOISE = 0.04
"""Log sd of a region's weight on polling day about its last one."""
TURNOUT_TILT = 0.2
"""Sd over parties of how much more, in log points, regions turn out per unit of the party's share there."""
SLOPE_SD = 0.12
NEW_PARTY_SEAT_SPREAD = 0.35


@dataclass(frozen=True)
class PollingDay:
    """What happened on polling day.

    Attributes
    ----------
    votes
        Votes by seat: columns seat, name, region, then the parties.
    turnout_weights
        Share of the turnout by region, dims (region,).
    turnout_tilt
        How much more, in log points, a region turned out per unit of a party's share there, dims (party,).
    slope
        How much stronger than its log share a party moved where it was strong, dims (party,).
    local_sd
        Sd of the local noise, log points, dims (party,).
    transfers
        Percent of each party's voters who voted for each other one in run-offs: from, to, rate; no row
        where there are none.
    """

    votes: pd.DataFrame
    turnout_weights: np.ndarray
    turnout_tilt: np.ndarray
    slope: np.ndarray
    local_sd: np.ndarray
    transfers: pd.DataFrame


def draw_polling_day(country: Country, *, rng: np.random.Generator) -> PollingDay:
    """Draw turnout and votes by seat, and how voters move on in run-offs.

    A region's votes are its true support, moved by the mean of its seats' local noise; the seats are
    then centred on the region's votes exactly (up to whole votes).
    """
    scenery = country.scenery
    codes = list(scenery.codes)
    turnout_noise = TURNOUT_NOISE * rng.normal(size=country.weights.size)
    tilt_rng, transfer_rng = rng.spawn(2)
    tilt = scenery.turnout_tilt * TURNOUT_TILT * tilt_rng.normal(size=len(codes))
    turnout_weights = country.weights * np.exp(turnout_noise + _above_country(country) @ tilt)
    turnout_weights /= turnout_weights.sum()
    slope = SLOPE_SD * rng.normal(size=len(codes))
    local_sd = country.local_sd
    if local_sd is None:
        local_sd = draw_local_sd(len(codes), log_sd=scenery.local_sd_log_sd, rng=rng)
    last_total = country.last_votes.drop(columns=["seat", "name", "region"]).to_numpy().sum()
    frames = []
    for r, region in enumerate(scenery.regions):
        seats = country.last_votes[country.last_votes["region"] == region.code].reset_index(drop=True)
        last_turnout = seats.drop(columns=["seat", "name", "region"]).sum(axis=1).to_numpy()
        turnout = last_turnout * np.exp(0.03 * rng.normal(size=len(seats)))
        turnout *= turnout_weights[r] * last_total / turnout.sum()
        strength = _last_strength(country, seats=seats, region=r, rng=rng)
        noise = draw_local_noise(local_sd, seats=len(seats), clusters=region.clusters, rng=rng)
        log_support = log_softmax(country.log_support[-1, r] + noise.mean(axis=0))
        shares = _centred(
            (1 + slope) * strength + log_support + noise, turnout=turnout, target=np.exp(log_support)
        )
        table = pd.DataFrame(np.rint(shares * turnout[:, None]).astype(int), columns=codes)
        frames.append(pd.concat([seats[["seat", "name", "region"]], table], axis=1))
    return PollingDay(
        votes=pd.concat(frames, ignore_index=True),
        turnout_weights=turnout_weights,
        turnout_tilt=tilt,
        slope=slope,
        local_sd=local_sd,
        transfers=draw_transfers(scenery.counting, codes=codes, rng=transfer_rng),
    )


def _above_country(country: Country) -> np.ndarray:
    """How far each party's support in a region lies above the country's, dims (region, party)."""
    support = np.exp(country.log_support[-1])
    return np.asarray(support - country.weights @ support)


def _last_strength(
    country: Country, *, seats: pd.DataFrame, region: int, rng: np.random.Generator
) -> np.ndarray:
    """Log of a seat's last share over its region's, dims (seat, party); zero where absent."""
    scenery = country.scenery
    shares = handed_on(seats, scenery=scenery).to_numpy()
    # Half a vote keeps the logarithm finite where a weak party got none in a seat.
    shares = np.maximum(shares, 0.5) / shares.sum(axis=1, keepdims=True)
    strength = np.log(shares) - np.log(np.maximum(softmax(country.baseline[region]), 1e-300))
    for j, party in enumerate(scenery.parties):
        if party.is_new:
            strength[:, j] = NEW_PARTY_SEAT_SPREAD * rng.normal(size=len(seats))
    strength[:, ~scenery.standing()[region]] = 0.0
    return strength


def _centred(log_shares: np.ndarray, *, turnout: np.ndarray, target: np.ndarray) -> np.ndarray:
    """Seat shares whose turnout-weighted mean is the region's, by shifting each party's log share."""
    weights = turnout / turnout.sum()
    present = target > 0
    shift = np.zeros(target.size)
    for _ in range(200):
        mean = weights @ softmax(log_shares + shift)
        gap = np.log(target[present] / mean[present])
        shift[present] += gap
        if np.abs(gap).max() < 1e-12:
            break
    return softmax(log_shares + shift)


def count_winners(votes: pd.DataFrame, *, codes: tuple[str, ...]) -> pd.Series:
    """Seats by party when the most votes in a seat win it, in the order of ``codes``."""
    winners = votes[list(codes)].idxmax(axis=1)
    return winners.value_counts().reindex(list(codes), fill_value=0).rename("seats").rename_axis("code")
