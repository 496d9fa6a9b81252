"""What the last result and a rough look at the polls say before any fit: starts, scales, weights."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from aggregator.estimate.published_rows import CellArrays
from aggregator.inputs.contest import Contest
from aggregator.inputs.desk_inputs import DeskInputs
from models.arrays import CountryArrays, Floats

# Prior median of a party without any record; without any last result every party starts equal.
FREE_SHARE = 0.02
# Smallest share that scales and pilot reckon with, so that a vanished party keeps finite scales.
LEAST_SHARE = 0.005


@dataclass(frozen=True)
class LastShares:
    """The last result as shares.

    Attributes
    ----------
    by_region
        Dims (region, party), zero where the party had no votes.
    turnout
        Each region's share of all votes, dims (region).
    """

    by_region: Floats
    turnout: Floats


def last_shares(inputs: DeskInputs) -> LastShares:
    """Shares of the last result by region, and each region's share of the country's votes."""
    contest = inputs.contest
    parties, regions = list(contest.party_codes), list(contest.region_codes)
    if inputs.last_result is None:
        size = np.array([r.electorate or 1.0 for r in contest.regions] or [1.0])
        return LastShares(by_region=np.zeros((len(regions), len(parties))), turnout=size / size.sum())
    counts = votes_by_region(inputs.last_result, contest)
    return LastShares(
        by_region=counts / counts.sum(axis=1, keepdims=True), turnout=counts.sum(axis=1) / counts.sum()
    )


def votes_by_region(result: pd.DataFrame, contest: Contest) -> Floats:
    """Votes of a result by region and party, zero where there are none; dims (region, party)."""
    parties, regions = list(contest.party_codes), list(contest.region_codes)
    votes = result.reindex(columns=parties, fill_value=0.0).fillna(0.0)
    region = result["region"]
    if len(regions) == 1:
        region = region.where(region.isin(regions), regions[0])
    return votes.groupby(region).sum().reindex(regions, fill_value=0.0).to_numpy(float)


def country_arrays(
    contest: Contest,
    *,
    last: LastShares,
    standing: np.ndarray,
    cells: CellArrays,
    respondents: Floats,
    lean_size: Floats,
) -> CountryArrays:
    """Put parties and regions, and where they stood, into arrays."""
    anchored = last.by_region.sum() > 0
    national = last.turnout @ last.by_region
    where = np.maximum(last.turnout @ standing, 1e-9)
    pilot = _pilot_share(national, cells, respondents)
    free = np.flatnonzero(national == 0)
    # National even for a regional party: its scales are then wide where it stands, since few polls ask there.
    reference = np.maximum(np.where(national > 0, (national + pilot) / 2, pilot), LEAST_SHARE)
    # Where a party stands but had no votes last time, its share elsewhere is the best guess of its start.
    filled = np.where(last.by_region > 0, last.by_region, np.maximum(national / where, 1e-9))
    unknown = FREE_SHARE if anchored else 1 / len(contest.party_codes)
    return CountryArrays(
        parties=contest.party_codes,
        regions=contest.region_codes,
        turnout=last.turnout,
        standing=standing,
        start_log_share=np.log(np.where(national > 0, filled, unknown)),
        reference_share=np.minimum(reference, 0.95),
        lean_size=lean_size,
        pilot_share=pilot,
        free_party=free.astype(np.int64),
    )


def _pilot_share(last: Floats, cells: CellArrays, respondents: Floats) -> Floats:
    """Rough mean of all polls, sums of parties split as their pilot shares are."""
    parties = cells.partition.shape[2]
    share = np.where(last > 0, last, LEAST_SHARE) if last.sum() else np.full(parties, 1 / parties)
    for _ in range(3):
        share = share / share.sum()
        together = np.maximum((cells.partition * share).sum(axis=2), 1e-12)
        asked = cells.partition.sum(axis=1)
        split = np.einsum("rc,rcp->rp", cells.answers / together, cells.partition) * share
        weight = respondents / respondents.sum()
        split = split / cells.answers.sum(axis=1, keepdims=True) * (asked * share).sum(axis=1, keepdims=True)
        share = np.maximum(weight @ (split + (1 - asked) * share), LEAST_SHARE / 2)
    return share / share.sum()
