"""Published polls as one full row of shares each: what the rivals average.

A row of the register may lump parties: an alliance asked about as one, codes not asked gathered in the
remainder. A rival has no model to take such a figure apart, so it is **split by the last result's shares
within the lump** (equally where none of its parties had votes). Codes for which a row leaves no remainder at
all keep their last shares, and the row's own are scaled to the rest.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
import numpy.typing as npt
import pandas as pd

from aggregator.inputs.contest import Contest

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]

_KEPT = ["poll", "house", "start", "end", "published"]


def national_polls(polls: pd.DataFrame, *, contest: Contest, last: pd.Series | None) -> pd.DataFrame:
    """One row per poll that covers the country: its days, its respondents, shares 0–1 of every party.

    A poll entered as a breakdown by all regions is the respondents' mean of its rows.

    Parameters
    ----------
    polls
        ``DeskInputs.polls``.
    last
        Last result in the country, 0–1, index parties; None without one.

    Returns
    -------
    pandas.DataFrame
        ``poll, house, start, end, published, respondents`` and one column per party, in the order of
        publication: then end, respondents, name, so that the register's order never matters.
    """
    return _of_polls(polls, where=contest.region_codes, contest=contest, last=last)


def region_polls(
    polls: pd.DataFrame, *, region: str, contest: Contest, last: pd.Series | None
) -> pd.DataFrame:
    """The same for rows of one region alone, breakdowns included."""
    only = polls[[set(regions) == {region} for regions in polls["regions"]]]
    return _of_polls(only, where=(region,), contest=contest, last=last)


def _of_polls(
    polls: pd.DataFrame, *, where: Sequence[str], contest: Contest, last: pd.Series | None
) -> pd.DataFrame:
    parties = list(contest.party_codes)
    standing = np.array([any(contest.stands_in(party, region) for region in where) for party in parties])
    shares = _split_lumps(polls, contest=contest, prior=_prior(last, parties=parties), standing=standing)
    rows = polls[[*_KEPT, "regions", "respondents"]].reset_index(drop=True)
    rows = rows.join(pd.DataFrame(shares, columns=parties))
    everywhere = set(where)
    whole = np.array([set(regions) == everywhere for regions in rows["regions"]], dtype=bool)
    in_one = rows[whole].drop_duplicates("poll")
    in_parts = rows[~whole & ~rows["poll"].isin(in_one["poll"]).to_numpy(bool)]
    together = [_mean_of_parts(part, parties) for part in _covering(in_parts, everywhere)]
    table = pd.concat([in_one, *together]) if together else in_one
    table = table[[*_KEPT, "respondents", *parties]]
    return table.sort_values(["published", "end", "respondents", "poll"], ignore_index=True)


def _covering(rows: pd.DataFrame, everywhere: set[str]) -> Iterator[pd.DataFrame]:
    """Rows of each poll whose breakdown covers all regions without overlap."""
    for _, part in rows.groupby("poll", sort=True):
        covered = [region for regions in part["regions"] for region in regions]
        if len(covered) == len(everywhere) and set(covered) == everywhere:
            yield part


def _mean_of_parts(part: pd.DataFrame, parties: list[str]) -> pd.DataFrame:
    weight = part["respondents"].to_numpy(float)
    mean = np.average(part[parties].to_numpy(float), axis=0, weights=weight)
    return part.head(1).assign(respondents=weight.sum(), **dict(zip(parties, mean, strict=True)))


def _prior(last: pd.Series | None, *, parties: list[str]) -> Floats:
    """Last shares in the order of parties; all alike without a last result."""
    return np.ones(len(parties)) if last is None else last.reindex(parties).fillna(0.0).to_numpy(float)


def _split_lumps(polls: pd.DataFrame, *, contest: Contest, prior: Floats, standing: Mask) -> Floats:
    """Shares 0–1 of every party in every row, lumps taken apart, summing to 1; dims (row, party)."""
    parties = list(contest.party_codes)
    shares = np.zeros((len(polls), len(parties)))
    left = np.tile(standing, (len(polls), 1))
    for code in (code for code in contest.column_codes if code in polls.columns):
        figure = polls[code].to_numpy(float)
        members = np.isin(parties, contest.members_of(code)) & standing
        asked = ~np.isnan(figure)
        shares[asked] += figure[asked, None] * _parts(prior, members[None])
        left[asked] &= ~members
    remainder = polls["remainder"].to_numpy(float)
    lumped = ~np.isnan(remainder) & left.any(axis=1)
    shares[lumped] += remainder[lumped, None] * _parts(prior, left[lumped])
    # Nothing says what these have: they keep their last shares, and the row's own are scaled to the rest.
    silent = np.isnan(remainder) & left.any(axis=1)
    kept = np.where(left[silent], prior, 0.0) / prior[standing].sum()
    own = shares[silent]
    shares[silent] = kept + own * (1 - kept.sum(axis=1, keepdims=True)) / own.sum(axis=1, keepdims=True)
    return shares / shares.sum(axis=1, keepdims=True)


def _parts(prior: Floats, members: Mask) -> Floats:
    """Part of a lump that each of its members has: as in the last result, or alike where none had votes."""
    inside = np.where(members, prior, 0.0)
    none = inside.sum(axis=1) <= 0
    inside[none] = members[none]
    return inside / np.maximum(inside.sum(axis=1, keepdims=True), 1e-12)
