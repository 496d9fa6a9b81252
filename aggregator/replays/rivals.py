"""What a desk could say on a day without a model: rivals that see only what was published by then."""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.counting_terms import CountingRule
from aggregator.replays.methods import Method
from aggregator.replays.result_shares import COUNTRY, result_shares, seats_from_leads, votes_in_seats
from aggregator.replays.whole_polls import national_polls, region_polls

WINDOW_DAYS = 30
"""Of the plain mean: a month of fieldwork, as many newsrooms average (common practice)."""
HALF_LIFE_DAYS = 30.0
"""Of the decaying mean: a poll a month old counts half (common practice)."""
ENOUGH_IN_REGION = 500.0
"""Decayed respondents of a region's own polls from which on they, not the country's, give its swing: a share
of 40 % then has a standard error of about 2 points (common practice: below that, nobody reads a regional
sample by itself)."""


class Rivals:
    """The rivals of one contest, asked day by day.

    Parameters
    ----------
    polls
        Poll rows as ``DeskInputs.polls`` has them; rows published later than a day are not seen on it.
    contest
        The contest.
    last_result
        Votes at the last election, one row per seat or region; None without one: the rivals that stand on
        it are then silent.
    counted_result
        Votes of regions that vote before the others; uniform swing takes their seats as they were counted,
        from the day on which their count was published.
    """

    def __init__(
        self,
        polls: pd.DataFrame,
        *,
        contest: Contest,
        last_result: pd.DataFrame | None,
        counted_result: pd.DataFrame | None = None,
    ) -> None:
        self._contest = contest
        self._parties = list(contest.party_codes)
        self._last = None if last_result is None else result_shares(last_result, contest=contest)
        self._votes = None if last_result is None else votes_in_seats(last_result, contest=contest)
        self._counted = None if counted_result is None else votes_in_seats(counted_result, contest=contest)
        last = None if self._last is None else self._last.T[COUNTRY]
        self._national = national_polls(polls, contest=contest, last=last)
        self._regional = {
            region: region_polls(
                polls,
                region=region,
                contest=contest,
                last=None if self._last is None else self._last.T[region],
            )
            for region in (contest.region_codes if len(contest.region_codes) > 1 else ())
        }

    def support(self, day: pd.Timestamp) -> dict[Method, pd.DataFrame]:
        """Shares 0–1 each rival gives on a day: index region (``""``: country), columns parties."""
        national = _published_by(self._national, day)
        said: dict[Method, pd.DataFrame] = {}
        if len(national):
            latest = national.iloc[-1]
            said[Method.LATEST_POLL] = self._for_country(latest[self._parties])
            recent = national[national["end"] > day - pd.Timedelta(days=WINDOW_DAYS)]
            if len(recent):
                said[Method.MEAN_30_DAYS] = self._for_country(recent[self._parties].mean())
            said[Method.DECAYING_MEAN] = self._for_country(self._decaying_mean(national, day))
        if self._last is not None:
            said[Method.LAST_RESULT] = self._last
            swung = self._swung_regions(national, day)
            if swung is not None and len(self._contest.region_codes) > 1:
                said[Method.UNIFORM_SWING] = swung
        return said

    def seats(self, day: pd.Timestamp) -> dict[Method, pd.DataFrame]:
        """Part of each seat each rival gives each party on a day: index seat, columns parties.

        Rivals count leaders, so they are silent where seats are not counted by plurality.
        """
        rules = {terms.rule for terms, _ in self._contest.counting_groups}
        if self._votes is None or self._last is None or rules != {CountingRule.PLURALITY}:
            return {}
        said = {Method.LAST_RESULT: seats_from_leads(self._votes).droplevel("region")}
        change = self._changes(_published_by(self._national, day), day)
        if change is not None:
            swung = _swing_seats(self._votes, change=change, last=self._last, contest=self._contest)
            swung = self._with_counts_of(day, swung)
            said[Method.UNIFORM_SWING] = seats_from_leads(swung).droplevel("region")
        return said

    def _for_country(self, shares: pd.Series) -> pd.DataFrame:
        return shares.astype(float).to_frame().T.set_axis([COUNTRY])

    def _decaying_mean(self, polls: pd.DataFrame, day: pd.Timestamp) -> pd.Series:
        weight = _decayed(polls, day)
        return pd.Series(
            np.average(polls[self._parties].to_numpy(float), axis=0, weights=weight), index=self._parties
        )

    def _changes(self, national: pd.DataFrame, day: pd.Timestamp) -> pd.DataFrame | None:
        """Change since the last result, 0–1, dims (region, party): the country's, or a region's own."""
        if self._last is None or national.empty:
            return None
        swing = self._decaying_mean(national, day) - self._last.loc[COUNTRY]
        change = pd.DataFrame([swing] * len(self._contest.region_codes), index=self._contest.region_codes)
        for region, polls in self._regional.items():
            own = _published_by(polls, day)
            if len(own) and _decayed(own, day).sum() >= ENOUGH_IN_REGION:
                change.loc[region] = self._decaying_mean(own, day) - self._last.loc[region].fillna(0.0)
        return change

    def _with_counts_of(self, day: pd.Timestamp, seats: pd.DataFrame) -> pd.DataFrame:
        """Put the votes of seats that were counted by a day in the place of what was expected of them."""
        if self._counted is None:
            return seats
        known = [r.code for r in self._contest.regions if r.counted and pd.Timestamp(r.counted) <= day]
        counted = self._counted[self._counted.index.get_level_values("region").isin(known)]
        counted = counted.loc[counted.index.intersection(seats.index)]
        return pd.concat([seats.drop(index=counted.index), counted]).loc[seats.index]

    def _swung_regions(self, national: pd.DataFrame, day: pd.Timestamp) -> pd.DataFrame | None:
        change = self._changes(national, day)
        if change is None or self._last is None:
            return None
        swung = (self._last.loc[change.index] + change).clip(lower=0.0) * _standing(self._contest)
        return swung.div(swung.sum(axis=1), axis=0)


def _published_by(polls: pd.DataFrame, day: pd.Timestamp) -> pd.DataFrame:
    return polls[polls["published"] <= day]


def _decayed(polls: pd.DataFrame, day: pd.Timestamp) -> np.ndarray:
    age = np.maximum((day - polls["end"]).dt.days.to_numpy(float), 0.0)
    return polls["respondents"].to_numpy(float) * 0.5 ** (age / HALF_LIFE_DAYS)


def _standing(contest: Contest) -> pd.DataFrame:
    return pd.DataFrame(
        [[float(contest.stands_in(p, r)) for p in contest.party_codes] for r in contest.region_codes],
        index=list(contest.region_codes),
        columns=list(contest.party_codes),
    )


def _swing_seats(
    votes: pd.DataFrame, *, change: pd.DataFrame, last: pd.DataFrame, contest: Contest
) -> pd.DataFrame:
    """Last shares of every seat plus the change of its region.

    A party without votes in a seat starts there at its share of the region. NaN where a party does not stand.
    """
    region = votes.index.get_level_values("region")
    shares = votes.div(votes.sum(axis=1), axis=0)
    start = last.loc[region].set_axis(votes.index)
    swung = shares.where(shares.notna(), start) + change.loc[region].set_axis(votes.index)
    return swung.where(_standing(contest).loc[region].set_axis(votes.index) > 0)
