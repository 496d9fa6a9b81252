"""The only door from the desk's tables to the model's arrays."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np
import pandas as pd

from aggregator.estimate.knots import build_knots, knot_weights
from aggregator.estimate.published_rows import PublishedRows, read_rows
from aggregator.inputs.contest import Contest
from aggregator.inputs.desk_inputs import DeskInputs
from models.arrays import CountryArrays, ElectionArrays, Floats, RowArrays

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


def build_arrays(inputs: DeskInputs) -> ElectionArrays:
    """Turn checked desk inputs into the arrays of the model.

    Parties and regions keep the order of the contest file, houses are sorted by name.
    """
    contest = inputs.contest
    polls = inputs.polls
    standing = np.array(
        [[contest.stands_in(p, r) for p in contest.party_codes] for r in contest.region_codes]
    )
    last = last_shares(inputs)
    published = read_rows(inputs, turnout=last.turnout, standing=standing)
    country = _country(contest, last=last, standing=standing, published=published)
    knots = build_knots(
        last_result=contest.last_result.date
        if inputs.last_result is not None and contest.last_result
        else None,
        first_fieldwork=polls["start"].min().date(),
        middle_fieldwork=_middle(polls),
        polling_day=contest.polling_day,
    )
    zero = contest.polling_day.toordinal() - knots.national_day[-1]
    first = np.array([d.toordinal() for d in published.start], dtype=float) - zero
    final = np.array([d.toordinal() for d in published.end], dtype=float) - zero
    houses = tuple(sorted(polls["house"].unique()))
    position = {house: i for i, house in enumerate(houses)}
    poll_labels = tuple(dict.fromkeys(published.poll))
    rows = RowArrays(
        polls=poll_labels,
        houses=houses,
        poll_of_row=np.array([poll_labels.index(p) for p in published.poll], dtype=np.int64),
        house_of_row=np.array([position[h] for h in published.house], dtype=np.int64),
        national_weight=knot_weights(knots.national_day, first_day=first, last_day=final),
        region_weight=knot_weights(knots.region_day, first_day=first, last_day=final),
        region_mix=published.region_mix,
        respondents=published.respondents,
        poll_respondents=published.poll_respondents,
        weighting_known=published.weighting_known,
        partition=published.partition,
        answers=published.answers,
        used=published.used,
        small_row=published.small_row,
        small_cell=published.small_cell,
        small_low=published.small_low,
        small_high=published.small_high,
    )
    arrays = ElectionArrays(country=country, knots=knots, rows=rows)
    arrays.check()
    return arrays


def last_shares(inputs: DeskInputs) -> LastShares:
    """Shares of the last result by region, and each region's share of the country's votes."""
    contest = inputs.contest
    parties, regions = list(contest.party_codes), list(contest.region_codes)
    if inputs.last_result is None:
        size = np.array([r.electorate or 1.0 for r in contest.regions] or [1.0])
        return LastShares(by_region=np.zeros((len(regions), len(parties))), turnout=size / size.sum())
    table = inputs.last_result
    votes = table.reindex(columns=parties, fill_value=0.0).fillna(0.0)
    region = (
        table["region"].where(table["region"].isin(regions), regions[0])
        if len(regions) == 1
        else table["region"]
    )
    counts = votes.groupby(region).sum().reindex(regions).to_numpy(float)
    return LastShares(
        by_region=counts / counts.sum(axis=1, keepdims=True), turnout=counts.sum(axis=1) / counts.sum()
    )


def _country(
    contest: Contest, *, last: LastShares, standing: np.ndarray, published: PublishedRows
) -> CountryArrays:
    anchored = last.by_region.sum() > 0
    national = last.turnout @ last.by_region
    where = np.maximum(last.turnout @ standing, 1e-9)
    pilot = _pilot_share(national, published)
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
        pilot_share=pilot,
        free_party=free.astype(np.int64),
    )


def _pilot_share(last: Floats, published: PublishedRows) -> Floats:
    """Rough mean of all polls, sums of parties split as their pilot shares are."""
    parties = published.partition.shape[2]
    share = np.where(last > 0, last, LEAST_SHARE) if last.sum() else np.full(parties, 1 / parties)
    for _ in range(3):
        share = share / share.sum()
        cells = np.maximum((published.partition * share).sum(axis=2), 1e-12)
        asked = published.partition.sum(axis=1)
        split = np.einsum("rc,rcp->rp", published.answers / cells, published.partition) * share
        weight = published.respondents / published.respondents.sum()
        split = (
            split / published.answers.sum(axis=1, keepdims=True) * (asked * share).sum(axis=1, keepdims=True)
        )
        share = np.maximum(weight @ (split + (1 - asked) * share), LEAST_SHARE / 2)
    return share / share.sum()


def _middle(polls: pd.DataFrame) -> date:
    return polls["end"].sort_values().iloc[len(polls) // 2].date()
