"""A result, seat by seat or region by region, as shares, winners and seats."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from functools import cached_property

import numpy as np
import pandas as pd

from aggregator.errors import InputError
from aggregator.inputs.contest import Contest, CountingRule
from aggregator.problems import Problem
from aggregator.release.codes import Code, contest_codes

COUNTRY = ""
"""How tables call the whole country."""
OUTCOME_FILE = "result_outcome.csv"
_RULE = "replay"
"""What a finding of scoring says in the place of a reading rule's number."""


@dataclass(frozen=True)
class ScoredCodes:
    """The codes that are scored, and which parties each sums.

    Attributes
    ----------
    codes
        Parties, others, and the alliances that exist on polling day.
    parties
        Codes of parties, others included.
    """

    codes: tuple[Code, ...]
    parties: tuple[str, ...]

    @cached_property
    def sums(self) -> pd.DataFrame:
        """Which parties (columns) each code (row) sums, 0 or 1."""
        rows = [[float(party in code.members) for party in self.parties] for code in self.codes]
        return pd.DataFrame(rows, index=[code.code for code in self.codes], columns=list(self.parties))

    @property
    def levels(self) -> dict[str, str]:
        """Level of each code."""
        return {code.code: str(code.level) for code in self.codes}


def scored_codes(contest: Contest, *, on: date) -> ScoredCodes:
    """List the codes to score on a day: parties, others, alliances of that day."""
    codes = tuple(code for code in contest_codes(contest) if code.exists_on(on))
    return ScoredCodes(codes, contest.party_codes)


def votes_in_seats(result: pd.DataFrame, *, contest: Contest) -> pd.DataFrame:
    """Votes with one row per row of the result, its region and its seat as index, one column per party."""
    votes = result.reindex(columns=list(contest.party_codes)).astype(float)
    region = result["region"].where(result["region"].isin(contest.region_codes), contest.region_codes[0])
    return votes.set_axis(pd.MultiIndex.from_arrays([region, result["seat"]], names=["region", "seat"]))


def result_shares(result: pd.DataFrame, *, contest: Contest) -> pd.DataFrame:
    """Shares of a result in every region and in the country.

    Parameters
    ----------
    result
        Votes, one row per seat or region: ``seat``, ``region`` and one column per party.

    Returns
    -------
    pandas.DataFrame
        Shares 0–1, index region (``""`` for the country, first), columns parties; NaN in a region without
        votes.
    """
    votes = votes_in_seats(result, contest=contest).fillna(0.0)
    by_region = votes.groupby(level="region").sum().reindex(list(contest.region_codes), fill_value=0.0)
    country = by_region.sum().to_frame().T.set_axis([COUNTRY])
    every = pd.concat([country, by_region])
    return every.div(every.sum(axis=1).replace(0.0, np.nan), axis=0)


def seats_from_leads(votes: pd.DataFrame) -> pd.DataFrame:
    """Part of each seat that each party holds: 1 for the leader; leaders with equal votes share the seat.

    Parameters
    ----------
    votes
        Votes or shares, one row per seat, one column per party; NaN where the party does not stand.
    """
    most = votes.max(axis=1)
    leads = votes.eq(most, axis=0).astype(float)
    return leads.div(leads.sum(axis=1), axis=0)


def has_seats(outcome: pd.DataFrame, *, contest: Contest) -> bool:
    """Whether an outcome says who won which seat, by plurality."""
    return contest.counting.rule is CountingRule.PLURALITY and bool(outcome["seat"].astype(bool).all())


def seats_of_outcome(outcome: pd.DataFrame, *, contest: Contest) -> pd.DataFrame:
    """Who won each seat, 0 or 1, index seat, columns parties.

    Raises
    ------
    InputError
        If two parties have the most votes in a seat: votes alone do not say who won it.
    """
    votes = votes_in_seats(outcome, contest=contest)
    won = seats_from_leads(votes)
    tied = won.index[won.max(axis=1) < 1.0]
    if len(tied):
        raise InputError([_tie(str(seat), won.loc[(region, seat)]) for region, seat in tied])
    return won.droplevel("region")


def _tie(seat: str, shares: pd.Series) -> Problem:
    tied = " and ".join(str(code) for code in shares.index[shares > 0])
    return Problem(
        OUTCOME_FILE, None, None, f"the same votes for {tied} in seat {seat}", "one winner",
        "Add one vote to whom the lot, or the court, gave the seat.", _RULE,
    )  # fmt: skip
