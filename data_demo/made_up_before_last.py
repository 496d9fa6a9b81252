"""The election before the last one, from which the last result is drawn: the two teach how seats stray."""

from __future__ import annotations

import numpy as np
import pandas as pd

from data_demo.made_up_local_noise import draw_local_noise
from data_demo.made_up_scenery import OTHERS, Scenery

COUNTRY_MOVE = 0.12
"""Log sd of a party's move in the whole country between two elections."""
REGION_MOVE = 0.08
"""Log sd of a region's own move on top of it."""
SLOPE_SD = 0.12
LABELS = ["seat", "name", "region"]


def draw_next_votes(
    votes: pd.DataFrame, *, scenery: Scenery, local_sd: np.ndarray, rng: np.random.Generator
) -> pd.DataFrame:
    """Votes by seat one election later, for the same parties.

    The country moves, each region moves by itself, each party's strongholds a little more or less than its
    other seats, and every seat strays, the seats of a cluster together.

    Parameters
    ----------
    votes
        Columns seat, name, region, then the parties of the scenery that have last votes.
    local_sd
        Sd of the local noise, log points, dims (party,), over ``scenery.codes``.
    """
    codes = [code for code in votes if code not in LABELS]
    known = [scenery.codes.index(code) for code in codes]
    country = COUNTRY_MOVE * rng.normal(size=len(codes))
    slope = SLOPE_SD * rng.normal(size=len(codes))
    frames = []
    for region in scenery.regions:
        rows = votes[votes["region"] == region.code].reset_index(drop=True)
        cast = rows[codes].to_numpy(dtype=float)
        turnout = cast.sum(axis=1, keepdims=True)
        stands = cast.sum(axis=0) > 0
        # Half a vote keeps the logarithm finite where a weak party got none in a seat.
        log_share = np.log(np.maximum(cast, 0.5) / turnout)
        above_region = log_share - np.log(np.maximum(cast.sum(axis=0), 0.5) / turnout.sum())
        noise = draw_local_noise(local_sd[known], seats=len(rows), clusters=region.clusters, rng=rng)
        move = country + REGION_MOVE * rng.normal(size=len(codes))
        weight = np.where(stands, np.exp(log_share + slope * above_region + move + noise), 0.0)
        share = weight / weight.sum(axis=1, keepdims=True)
        came = turnout * np.exp(0.05 * rng.normal() + 0.03 * rng.normal(size=turnout.shape))
        frames.append(
            pd.concat([rows[LABELS], pd.DataFrame(np.rint(share * came).astype(int), columns=codes)], axis=1)
        )
    return pd.concat(frames, ignore_index=True)


def as_it_stood(votes: pd.DataFrame, *, scenery: Scenery) -> pd.DataFrame:
    """The result as counted: without the seats made since, and a party founded since among others."""
    since = scenery.since_before_last
    if since is None:
        return votes.iloc[:0]
    kept = votes[~votes["name"].isin(since.seats)].reset_index(drop=True)
    for code in since.parties:
        kept[OTHERS] += kept[code]
    return kept.drop(columns=list(since.parties))
