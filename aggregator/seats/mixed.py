"""Mixed chambers: some seats won locally by plurality, the others filled from lists.

Voters are taken to have one vote, or to cast both alike: the votes of the lists are those of the parties in
the region or country. In a parallel chamber the lists' seats are shared out by themselves; in a compensatory
one they make up for what the seats won locally leave out of proportion.
"""

from __future__ import annotations

import numpy as np

from aggregator.inputs.counting_terms import Across
from aggregator.seats.apportion.joint_lists import compensate_lists
from aggregator.seats.list_count import method_of, share_out, votes_of_lists
from aggregator.seats.plurality import count_firsts
from aggregator.seats.rules import GroupTerms, GroupVotes, IntArray, SeatArray, SeatsCounted


def count_mixed_parallel(votes: GroupVotes, terms: GroupTerms) -> SeatsCounted:
    """Count seats won locally, and beside them seats from lists in proportion to votes.

    Parameters
    ----------
    votes
        With votes by seat.
    terms
        With the seats filled from lists, by region or in all.
    """
    local = count_firsts(votes.in_rows)
    from_lists = np.zeros_like(local.seats)
    ties = local.ties.copy()
    for date in range(local.seats.shape[1]):
        won, tied = share_out(votes, terms, places=terms.list_seats, date=date)
        from_lists[:, date] = won.sum(axis=1)
        ties += tied
    return SeatsCounted(
        seats=local.seats + from_lists, won=local.won, from_lists=from_lists[:, -1], ties=ties
    )


def count_mixed_compensatory(votes: GroupVotes, terms: GroupTerms) -> SeatsCounted:
    """Count seats won locally, and fill the lists' seats so that all seats come near to proportion.

    Parameters
    ----------
    votes
        With votes by seat.
    terms
        With the seats filled from lists, by region or in all, and what becomes of overhang.
    """
    rows = votes.in_rows
    local = count_firsts(rows)
    by_place = _local_seats_by_place(votes, terms, local.seats)
    n_draws, n_dates, _, n_parties = by_place.shape
    regular = terms.list_seats + _rows_by_place(votes, terms)
    seats = np.zeros_like(local.seats)
    ties = local.ties.copy()
    for date in range(n_dates):
        counted = compensate_lists(
            votes_of_lists(votes, terms, date=date).reshape(-1, n_parties),
            local=by_place[:, date].reshape(-1, n_parties),
            seats=np.tile(regular, n_draws),
            method=method_of(terms),
            lists=terms.joint_lists,
            overhang=terms.terms.overhang.value,
            lot=np.repeat(votes.list_lot, len(regular), axis=0),
            ties=terms.terms.ties.value,
        )
        seats[:, date] = counted.seats.reshape(n_draws, -1, n_parties).sum(axis=1)
        ties += counted.tied.reshape(n_draws, -1).sum(axis=1)
    return SeatsCounted(seats=seats, won=local.won, from_lists=(seats - local.seats)[:, -1], ties=ties)


def _local_seats_by_place(votes: GroupVotes, terms: GroupTerms, seats: SeatArray) -> SeatArray:
    """Seats won locally: dims (draw, date, place, party)."""
    if terms.across is not Across.REGION:
        return seats[:, :, None]
    rows = votes.in_rows
    regions = range(rows.region_start.size - 1)
    return np.stack([count_firsts(rows.of_regions(np.array([r]))).seats for r in regions], axis=2)


def _rows_by_place(votes: GroupVotes, terms: GroupTerms) -> IntArray:
    """Seats that are filled locally in each place."""
    sizes = np.diff(votes.in_rows.region_start)
    return sizes if terms.across is Across.REGION else np.array([sizes.sum()])
