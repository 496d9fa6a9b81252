"""Lists: seats in proportion to votes, by district, by region, or over all regions of the group at once.

Others are many small parties and no list, so their votes count towards thresholds and win no list seat.
Where no list passes the threshold, all share as if there were none: seats must be filled, and laws differ.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from aggregator.inputs.counting_terms import Across, CountingTerms
from aggregator.seats.apportion.joint_lists import apportion_lists
from aggregator.seats.apportion.list_method import ListMethod, highest_averages, largest_remainder
from aggregator.seats.apportion.thresholds import passes_threshold
from aggregator.seats.rules import FloatArray, GroupTerms, GroupVotes, IntArray, SeatArray, SeatsCounted

PERCENT = 100.0


def count_by_lists(votes: GroupVotes, terms: GroupTerms) -> SeatsCounted:
    """Share seats out among lists, draw by draw and date by date.

    Parameters
    ----------
    votes
        With votes by row where seats are shared out by district.
    terms
        With members by district, or seats by region or in all.
    """
    n_draws, n_dates, _, n_parties = votes.region_votes.shape
    by_district = terms.across is Across.DISTRICT
    places = terms.magnitude if by_district else terms.list_seats
    seats = np.zeros((n_draws, n_dates, n_parties), dtype=np.int16)
    ties = np.zeros(n_draws, dtype=np.int64)
    won = np.zeros((n_draws, len(places), n_parties), dtype=np.int16)
    for date in range(n_dates):
        won, tied = share_out(votes, terms, places=places, date=date)
        seats[:, date] = won.sum(axis=1)
        ties += tied
    return SeatsCounted(
        seats=seats, won=_compact(won, terms) if by_district else None, from_lists=None, ties=ties
    )


def share_out(
    votes: GroupVotes, terms: GroupTerms, *, places: IntArray, date: int
) -> tuple[SeatArray, IntArray]:
    """Share the seats of every place out among its lists, on one date.

    Parameters
    ----------
    votes, terms
        As for `count_by_lists`.
    places
        Seats of each place, dims (place).
    date
        Position of the date.

    Returns
    -------
    seats, ties
        dims (draw, place, party); counts that were tied, dims (draw).
    """
    n_draws, n_parties = votes.list_lot.shape
    counted = apportion_lists(
        votes_of_lists(votes, terms, date=date).reshape(-1, n_parties),
        seats=np.tile(places, n_draws),
        method=method_of(terms),
        lists=terms.joint_lists,
        lot=np.repeat(votes.list_lot, len(places), axis=0),
        ties=terms.terms.ties.value,
    )
    shape = (n_draws, len(places), n_parties)
    return counted.seats.reshape(shape), counted.tied.reshape(n_draws, -1).sum(axis=1)


def _compact(won: SeatArray, terms: GroupTerms) -> npt.NDArray[np.signedinteger]:
    """Members by district, a byte each where that holds them: draws times districts are many."""
    largest = int(terms.magnitude.max(initial=0))
    return won.astype(np.int8 if largest <= np.iinfo(np.int8).max else np.int16)


def votes_of_lists(votes: GroupVotes, terms: GroupTerms, *, date: int) -> FloatArray:
    """Votes of the lists that pass the threshold, on one date.

    Returns
    -------
    numpy.ndarray
        dims (draw, place, party), proportional within a place; zero for those who can win no list seat.
    """
    rule = terms.terms
    cast = _cast_votes(votes, across=terms.across, date=date)
    counting = cast.copy()
    if terms.others is not None:
        counting[..., terms.others] = 0
    if rule.threshold is None:
        return counting
    share = _shares_for_threshold(votes, cast, rule, date=date)
    if terms.others is not None:
        share[..., terms.others] = 0
    needed = rule.threshold if rule.alliance_threshold is None else rule.alliance_threshold
    passes = passes_threshold(
        share.reshape(-1, share.shape[-1]),
        threshold=rule.threshold / PERCENT,
        exempt=terms.exempt,
        lists=terms.joint_lists,
        alliance_threshold=needed / PERCENT,
    ).reshape(share.shape)
    # Over the country some list passes; in this place it may not stand.
    some = ((counting > 0) & passes).any(axis=-1, keepdims=True)
    return np.where(passes | ~some, counting, 0.0)


def method_of(terms: GroupTerms) -> ListMethod:
    """Give the method by which list seats are shared out."""
    rule = terms.terms
    if rule.divisors is not None:
        return highest_averages(rule.divisors.value, first_divisor=terms.first_divisor)
    if rule.quota is None:
        raise ValueError("A rule with lists needs divisors or a quota.")
    return largest_remainder(rule.quota.value)


def _cast_votes(votes: GroupVotes, *, across: Across, date: int) -> FloatArray:
    """Votes by draw, place and party on one date."""
    if across is Across.DISTRICT:
        rows = votes.in_rows
        # As they stand, not as shares: whole votes of a count stay whole, and ties between them exact.
        factor = rows.multiplier[:, date, rows.region_of_seat].astype(np.float64)
        return factor * rows.strength.transpose(0, 2, 1)
    if across is Across.REGION:
        return votes.region_votes[:, date].astype(np.float64)
    return votes.votes_together(date)[:, None]


def _shares_for_threshold(
    votes: GroupVotes, cast: FloatArray, rule: CountingTerms, *, date: int
) -> FloatArray:
    """Shares that are held against the threshold, for every place: dims (draw, place, party)."""
    if rule.threshold_across is rule.across:
        return cast / cast.sum(axis=-1, keepdims=True)
    if rule.threshold_across is Across.COUNTRY:
        together = votes.votes_together(date)
        together /= together.sum(axis=-1, keepdims=True)
        return np.repeat(together[:, None], cast.shape[1], axis=1)
    if rule.threshold_across is Across.REGION and rule.across is Across.DISTRICT:
        regional = votes.region_votes[:, date, votes.in_rows.region_of_seat]
        return regional.astype(np.float64)
    raise ValueError(f"A threshold across the {rule.threshold_across} needs votes there.")
