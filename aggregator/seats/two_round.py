"""Two rounds: who has enough votes wins at once, else the leaders of the first round run again.

In the run-off a finalist keeps its votes. The voters of each party that is out go to the finalists at the
drawn rates of transfer, and the rest stay at home; where the rates to all finalists together exceed one
they are scaled down to it. An exact tie for the seat is decided by lot; one for the last place in the
run-off, by the same lot.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from aggregator.seats.rules import GroupTerms, GroupVotes, SeatsCounted

PERCENT = 100.0
FINALISTS = 2


def count_by_two_rounds(votes: GroupVotes, terms: GroupTerms) -> SeatsCounted:
    """Count the seats each party wins in one or two rounds, draw by draw and date by date.

    Parameters
    ----------
    votes
        First-round votes in every seat.
    terms
        With ``outright`` and ``run_off_threshold`` (percent of the seat's votes; None: the first two), and
        the drawn rates of transfer. Where fewer than two parties reach the threshold, the first two run.
    """
    if terms.transfers is None:
        raise ValueError("Two rounds need rates of transfer.")
    rows = votes.in_rows
    threshold = terms.terms.run_off_threshold
    seats, won, ties = _count(
        rows.strength,
        rows.multiplier,
        rows.region_start,
        rows.lot,
        terms.transfers,
        np.float32(terms.terms.outright / PERCENT),
        np.float32(np.inf if threshold is None else threshold / PERCENT),
    )
    return SeatsCounted(seats=seats, won=won, from_lists=None, ties=ties)


# Each draw is one thread's work from start to end: the number of threads changes nothing.
@njit(parallel=True, cache=True)
def _count(strength, multiplier, region_start, lot, transfers, outright, threshold):  # type: ignore[no-untyped-def]
    n_draws, n_parties, n_seats = strength.shape
    n_dates = multiplier.shape[1]
    seats = np.zeros((n_draws, n_dates, n_parties), dtype=np.int16)
    won = np.zeros((n_draws, n_seats, n_parties), dtype=np.int8)
    ties = np.zeros(n_draws, dtype=np.int64)
    for draw in prange(n_draws):
        share = np.empty(n_parties, dtype=np.float32)
        final = np.empty(n_parties, dtype=np.float32)
        runs = np.empty(n_parties, dtype=np.bool_)
        for region in range(region_start.size - 1):
            for seat in range(region_start[region], region_start[region + 1]):
                ticket = lot[draw, seat]
                for date in range(n_dates):
                    total = np.float32(0)
                    for party in range(n_parties):
                        share[party] = strength[draw, party, seat] * multiplier[draw, date, region, party]
                        total += share[party]
                    share /= total
                    winner, tied = _most(share, ticket)
                    by_lot = tied > 1
                    if share[winner] <= outright:
                        by_lot = _choose_finalists(share, threshold, ticket, runs)
                        _run_off(share, runs, transfers[draw], final)
                        winner, tied = _most(final, ticket)
                        by_lot = by_lot or tied > 1
                    ties[draw] += by_lot
                    seats[draw, date, winner] += 1
                    if date == n_dates - 1:
                        won[draw, seat, winner] = 1
    return seats, won, ties


@njit(cache=True)
def _most(votes, ticket):  # type: ignore[no-untyped-def]
    """Position of the most votes, of several the one the ticket points at, and how many had most."""
    most = votes.max()
    tied = 0
    for party in range(votes.size):
        tied += votes[party] == most
    chosen = int(ticket * tied)
    for party in range(votes.size):
        if votes[party] == most:
            if chosen == 0:
                return party, tied
            chosen -= 1
    return 0, tied


@njit(cache=True)
def _choose_finalists(share, threshold, ticket, runs):  # type: ignore[no-untyped-def]
    """Mark who runs again; tell whether a lot had to decide the last place."""
    above = 0
    for party in range(share.size):
        runs[party] = share[party] >= threshold
        above += runs[party]
    if above >= FINALISTS:
        return False
    runs[:] = False
    by_lot = False
    left = share.copy()
    for place in range(FINALISTS):
        party, tied = _most(left, ticket)
        by_lot = place == FINALISTS - 1 and tied > 1
        if left[party] > 0:
            runs[party] = True
        left[party] = -1
    return by_lot


@njit(cache=True)
def _run_off(share, runs, part, final):  # type: ignore[no-untyped-def]
    """Votes of the finalists in the second round, parts of the first round's votes."""
    for party in range(share.size):
        final[party] = share[party] if runs[party] else 0
    for donor in range(share.size):
        if runs[donor] or share[donor] == 0:
            continue
        given = np.float32(0)
        for heir in range(share.size):
            if runs[heir]:
                given += part[donor, heir]
        scale = share[donor] / max(given, np.float32(1))
        for heir in range(share.size):
            if runs[heir]:
                final[heir] += scale * part[donor, heir]
