"""Plurality: in each seat the party with the most votes wins.

An exact tie is decided by lot, as many electoral laws do (common practice): each seat holds one ticket per
draw, the same on all dates, and the tied parties have equal chances. So no party gains from its place in
the file. With local noise single precision ties about one seat in ten million.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from aggregator.seats.rules import GroupTerms, GroupVotes, SeatsCounted, SeatVotes


def count_by_plurality(votes: GroupVotes, terms: GroupTerms) -> SeatsCounted:
    """Count the seats each party wins, draw by draw; every seat has at least one party standing."""
    return count_firsts(votes.in_rows)


def count_firsts(votes: SeatVotes) -> SeatsCounted:
    """Count the seats in which each party has most votes, draw by draw and date by date.

    Parameters
    ----------
    votes
        Votes in every seat; every seat has at least one party standing.
    """
    seats, ties = _count(votes.strength, votes.multiplier, votes.region_start, votes.lot)
    won = _winners(votes.strength, votes.multiplier[:, -1], votes.region_start, votes.lot)
    return SeatsCounted(seats=seats, won=won, from_lists=None, ties=ties)


# Each draw is one thread's work from start to end: the number of threads changes nothing. Party after party
# over a row of seats, first the running maximum, then who equals it: both loops run several seats at a time.
@njit(parallel=True, cache=True)
def _count(strength, multiplier, region_start, lot):  # type: ignore[no-untyped-def]
    n_draws, n_parties, _ = strength.shape
    n_dates, n_regions = multiplier.shape[1], multiplier.shape[2]
    seats = np.zeros((n_draws, n_dates, n_parties), dtype=np.int16)
    ties = np.zeros(n_draws, dtype=np.int64)
    for draw in prange(n_draws):
        won = np.empty(n_parties, dtype=np.int32)
        for region in range(n_regions):
            first, last = region_start[region], region_start[region + 1]
            here = strength[draw, :, first:last]
            most = np.empty(last - first, dtype=np.float32)
            for date in range(n_dates):
                factor = multiplier[draw, date, region]
                _count_firsts(here, factor, most, won)
                if won.sum() > most.size:
                    won[:] = 0
                    for seat in range(most.size):
                        winner, tied = _winner(here[:, seat], factor, lot[draw, first + seat])
                        won[winner] += 1
                        ties[draw] += tied > 1
                for party in range(n_parties):
                    seats[draw, date, party] += won[party]
    return seats, ties


@njit(cache=True)
def _count_firsts(strength, factor, most, won):  # type: ignore[no-untyped-def]
    """Seats in which each party has the most votes, written into ``won``; a tie counts for all in it."""
    most[:] = -1
    for party in range(factor.size):
        row = strength[party]
        for seat in range(most.size):
            votes = row[seat] * factor[party]
            most[seat] = votes if votes > most[seat] else most[seat]
    for party in range(factor.size):
        row = strength[party]
        firsts = np.int32(0)
        for seat in range(most.size):
            firsts += np.int32(row[seat] * factor[party] == most[seat])
        won[party] = firsts


@njit(parallel=True, cache=True)
def _winners(strength, multiplier, region_start, lot):  # type: ignore[no-untyped-def]
    """Whether each party wins each seat, 0 or 1: dims (draw, seat, party)."""
    n_draws, n_parties, n_seats = strength.shape
    won = np.zeros((n_draws, n_seats, n_parties), dtype=np.int8)
    for draw in prange(n_draws):
        for region in range(multiplier.shape[1]):
            factor = multiplier[draw, region]
            for seat in range(region_start[region], region_start[region + 1]):
                winner, _ = _winner(strength[draw, :, seat], factor, lot[draw, seat])
                won[draw, seat, winner] = 1
    return won


@njit(cache=True)
def _winner(strength, factor, lot):  # type: ignore[no-untyped-def]
    """Party with most votes in one seat, of several the one the lot points at, and how many had most."""
    most = np.float32(-1)
    tied = 0
    for party in range(factor.size):
        votes = strength[party] * factor[party]
        if votes > most:
            most, tied = votes, 1
        elif votes == most:
            tied += 1
    chosen = int(lot * tied)
    for party in range(factor.size):
        if strength[party] * factor[party] == most:
            if chosen == 0:
                return party, tied
            chosen -= 1
    return 0, tied
