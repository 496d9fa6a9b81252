"""Polling day counted again with more or fewer votes for each code that a majority may hang on.

Which codes: parties and alliances with a real chance of a majority, and in any case the two parties with most
votes; set at equal votes are those two, and the two largest sides where an alliance is one of them.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.seats.counting import count_shifted
from aggregator.seats.majorities import codes_near_majority, majority_line, parties_and_holdings
from aggregator.seats.prepare import PreparedSeats
from aggregator.seats.seats_votes import SHIFT, plan_shifts
from models.dimensions import CHAIN, DRAW, PARTY

MOST_DRAWS = 1_000
"""Draws that are counted again; a thousand give a quantile's position within about 1.4 points of level."""

type Members = Mapping[str, tuple[str, ...]]


def count_votes_to_seats(
    prepared: PreparedSeats, *, draws: xr.Dataset, seats: xr.Dataset, contest: Contest
) -> xr.Dataset:
    """Count polling day under every shift that the table of seats against votes needs.

    Parameters
    ----------
    prepared
        The chamber, as `aggregator.seats.prepare.prepare_seats` returns it.
    draws
        Needs ``national_support_polling_day`` (chain, draw, party), 0–1.
    seats
        Needs ``seats_polling_day`` (chain, draw, party).
    contest
        Gives the alliances of polling day and the majority line.

    Returns
    -------
    xr.Dataset
        ``seats`` and ``votes`` (draw, shift, party), votes as a share of all, 0–1; coordinates ``code``,
        ``against`` and ``log_factor`` (shift), as `aggregator.seats.seats_votes.plan_shifts` has them.
    """
    votes = draws["national_support_polling_day"]
    codes = choose_codes(votes, seats=seats["seats_polling_day"], contest=contest)
    plan = plan_shifts(votes, codes=codes, pairs=choose_pairs(votes, contest=contest))
    every = -(-votes.sizes[CHAIN] * votes.sizes[DRAW] // MOST_DRAWS)
    shifts = plan.sel({PARTY: list(prepared.parties)}).to_numpy()
    shifted = count_shifted(prepared, shifts=shifts, contest=contest, every=every)
    return shifted.assign_coords(
        {name: (SHIFT, plan[name].to_numpy()) for name in ("code", "against", "log_factor")}
    )


def choose_codes(votes: xr.DataArray, *, seats: xr.DataArray, contest: Contest) -> dict[str, tuple[str, ...]]:
    """Choose whose votes are shifted, with their members, parties first.

    Parameters
    ----------
    votes, seats
        Of polling day, dims (chain, draw, party).
    contest
        Gives the alliances of polling day and the majority line.
    """
    line = majority_line(contest, chamber=seats.sum(PARTY, dtype=np.int64).transpose(CHAIN, DRAW).to_numpy())
    alliances = [each for each in contest.alliances if each.active_on(contest.last_polling_day)]
    near = codes_near_majority(seats, alliances=alliances, majority=line)
    paired = {code for pair in choose_pairs(votes, contest=contest) for code in pair}
    every = _parties(votes) | {each.code: each.members for each in alliances}
    return {code: members for code, members in every.items() if code in near or code in paired}


def choose_pairs(votes: xr.DataArray, *, contest: Contest) -> list[tuple[str, str]]:
    """Choose who is set at equal votes: the two parties with most, and the two largest sides.

    A side is an alliance of polling day or a party outside the largest of them.

    Parameters
    ----------
    votes
        Votes on polling day, dims (chain, draw, party).
    contest
        Gives the alliances of polling day.
    """
    alliances = [each for each in contest.alliances if each.active_on(contest.last_polling_day)]
    parties = _parties(votes)
    first = _two_largest(votes, parties)
    sides = _two_largest(votes, parties | {each.code: each.members for each in alliances})
    return list(dict.fromkeys(pair for pair in (first, sides) if pair is not None))


def _parties(votes: xr.DataArray) -> dict[str, tuple[str, ...]]:
    return {code: (code,) for code in parties_and_holdings(votes)[0]}


def _two_largest(votes: xr.DataArray, members: Members) -> tuple[str, str] | None:
    """The code with most votes, and the one with most votes of those without a member of it."""
    mean = votes.mean((CHAIN, DRAW))
    size = {code: float(mean.sel({PARTY: list(of)}).sum()) for code, of in members.items()}
    ordered = sorted(size, key=lambda code: -size[code])
    for second in ordered[1:]:
        if not set(members[second]) & set(members[ordered[0]]):
            return ordered[0], second
    return None
