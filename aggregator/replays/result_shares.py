"""A result, seat by seat or region by region, as shares, winners and seats."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from functools import cached_property

import numpy as np
import pandas as pd

from aggregator.errors import InputError
from aggregator.inputs.contest import Contest
from aggregator.inputs.counting_terms import LIST_RULES, CountingTerms
from aggregator.problems import Problem
from aggregator.release.codes import Code, contest_codes
from aggregator.seats.count_result import count_result, votes_say_seats

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


@dataclass(frozen=True)
class OutcomeSeats:
    """Seats of an outcome.

    Attributes
    ----------
    total
        Seats of the whole chamber, index party.
    won
        Who won a seat of each row, 0 or 1, index seat, columns parties; None where rows elect nobody.
    """

    total: pd.Series
    won: pd.DataFrame | None


def has_seats(outcome: pd.DataFrame, *, contest: Contest) -> bool:
    """Tell whether the votes of an outcome say who won which seats: not where a second round decides."""
    if not votes_say_seats(contest):
        return False
    by_row = [r for terms, regions in contest.counting_groups if terms.elects_by_row for r in regions]
    rows = outcome[outcome["region"].isin(by_row)] if len(contest.region_codes) > 1 else outcome
    return bool(rows["seat"].astype(bool).all())


def seats_of_outcome(outcome: pd.DataFrame, *, contest: Contest) -> OutcomeSeats:
    """Count the seats of an outcome by the contest's rules.

    Raises
    ------
    InputError
        If a tie leaves a seat open: votes alone do not say who won it.
    """
    votes = votes_in_seats(outcome, contest=contest)
    single = [r for terms, regions in contest.counting_groups if not _only_lists(terms) for r in regions]
    leads = seats_from_leads(votes[votes.index.get_level_values("region").isin(single)])
    tied = leads.index[leads.max(axis=1) < 1.0]
    if len(tied):
        raise InputError([_tie(str(seat), leads.loc[(region, seat)]) for region, seat in tied])
    placed = outcome.assign(region=votes.index.get_level_values("region"))
    counted = count_result(placed, contest=contest)
    if int(counted["ties"]):
        raise InputError([_tied_lists()])
    parties = list(contest.party_codes)
    total = counted["seats"].to_series()[parties]
    if "won" not in counted:
        return OutcomeSeats(total, None)
    known = set(counted["seat"].to_numpy().tolist())
    order = [seat for seat in outcome["seat"].astype(str) if seat in known]
    won = counted["won"].sel(seat=order, party=parties).transpose("seat", "party").to_numpy() > 0
    return OutcomeSeats(total, pd.DataFrame(won.astype(float), index=order, columns=parties))


def _only_lists(terms: CountingTerms) -> bool:
    return terms.rule in LIST_RULES


def _tie(seat: str, shares: pd.Series) -> Problem:
    tied = " and ".join(str(code) for code in shares.index[shares > 0])
    return Problem(
        OUTCOME_FILE, None, None, f"the same votes for {tied} in seat {seat}", "one winner",
        "Add one vote to whom the lot, or the court, gave the seat.", _RULE,
    )  # fmt: skip


def _tied_lists() -> Problem:
    return Problem(
        OUTCOME_FILE, None, None, "two lists with the same claim to a last seat", "one winner",
        "Add one vote to whom the lot, or the court, gave the seat.", _RULE,
    )  # fmt: skip
