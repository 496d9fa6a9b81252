"""Joint lists: parties that are one list where seats are shared out, and share its seats afterwards."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt

from aggregator.seats.apportion.apportion import Apportioned, apportion
from aggregator.seats.apportion.compensation import Compensated, compensate
from aggregator.seats.apportion.list_method import ListMethod

FloatArray = npt.NDArray[np.float64]
IntArray = npt.NDArray[np.int64]


def apportion_lists(
    votes: FloatArray,
    *,
    seats: npt.NDArray[np.int64] | int,
    method: ListMethod,
    lists: Sequence[Sequence[int]],
    lot: npt.NDArray[np.floating],
    ties: str = "lot",
) -> Apportioned:
    """Share out seats among lists, then each joint list's seats among its members by the same method.

    Parameters
    ----------
    votes, seats, method, lot, ties
        As for :func:`apportion`. A joint list's votes are the sum of its members', exact for whole numbers
        of votes; its ticket is made of theirs, and as fair as any.
    lists
        Positions of the parties of each joint list. Parties in none stand alone.

    Returns
    -------
    Apportioned
        Seats by party; tied where any step was.

    Raises
    ------
    ValueError
        As for :func:`apportion`, and if joint lists overlap or name no party.
    """
    n_parties = votes.shape[1]
    check_lists(lists, n_parties=n_parties)
    groups = _as_groups(lists, n_parties=n_parties)
    of_lists = apportion(
        _group_sums(votes, groups), seats=seats, method=method, lot=_group_lots(lot, groups), ties=ties
    )

    def among(members: list[int], won: IntArray) -> Apportioned:
        return apportion(votes[:, members], seats=won, method=method, lot=lot[:, members], ties=ties)

    return _share_among_members(of_lists, groups, n_parties, among)


def compensate_lists(
    votes: FloatArray,
    *,
    local: npt.NDArray[np.integer],
    seats: npt.NDArray[np.int64] | int,
    method: ListMethod,
    lists: Sequence[Sequence[int]],
    overhang: str = "kept",
    lot: npt.NDArray[np.floating],
    ties: str = "lot",
) -> Compensated:
    """Share out a mixed chamber among lists, then each joint list's seats among its members.

    Within a joint list members keep their local seats; its other seats make up for them by the same method,
    without growing (the rule ``within``).

    Parameters
    ----------
    votes, local, seats, method, overhang, lot, ties
        As for :func:`compensate`.
    lists
        As for :func:`apportion_lists`.

    Returns
    -------
    Compensated
        Seats by party, never below the local ones; tied where any step was.

    Raises
    ------
    ValueError
        As for :func:`compensate`, and if joint lists overlap or name no party.
    """
    n_parties = votes.shape[1]
    check_lists(lists, n_parties=n_parties)
    groups = _as_groups(lists, n_parties=n_parties)
    of_lists = compensate(
        _group_sums(votes, groups),
        local=_group_sums(local, groups),
        seats=seats,
        method=method,
        overhang=overhang,
        lot=_group_lots(lot, groups),
        ties=ties,
    )

    def among(members: list[int], won: IntArray) -> Apportioned:
        return compensate(
            votes[:, members],
            local=local[:, members],
            seats=won,
            method=method,
            overhang="within",
            lot=lot[:, members],
            ties=ties,
        )

    shared = _share_among_members(of_lists, groups, n_parties, among)
    return Compensated(seats=shared.seats, tied=shared.tied, stopped=of_lists.stopped)


def _share_among_members(
    of_lists: Apportioned,
    groups: list[list[int]],
    n_parties: int,
    among: Callable[[list[int], IntArray], Apportioned],
) -> Apportioned:
    """From seats by list to seats by party; ``among`` shares a list's seats out among its members."""
    filled = np.zeros((len(of_lists.seats), n_parties), dtype=np.int16)
    tied = of_lists.tied.copy()
    for position, members in enumerate(groups):
        won = of_lists.seats[:, position]
        if len(members) == 1:
            filled[:, members[0]] = won
            continue
        shared = among(members, won.astype(np.int64))
        filled[:, members] = shared.seats
        tied |= shared.tied
    return Apportioned(seats=filled, tied=tied)


def check_lists(lists: Sequence[Sequence[int]], *, n_parties: int) -> None:
    """Raise if joint lists overlap, are empty, or name a position without a party."""
    named = [party for members in lists for party in members]
    if any(not 0 <= party < n_parties for party in named) or not all(map(len, lists)):
        raise ValueError(f"lists: got {lists}; expected positions from 0 to {n_parties - 1} in each")
    if len(set(named)) < len(named):
        raise ValueError(f"lists: got {lists}; a party can be on one list only")


def _as_groups(lists: Sequence[Sequence[int]], *, n_parties: int) -> list[list[int]]:
    """All lists: the joint ones, and every other party as a list of its own; by their first party."""
    joint = {party for members in lists for party in members}
    alone = [[party] for party in range(n_parties) if party not in joint]
    return sorted([sorted(members) for members in lists] + alone)


def _group_sums[Number: np.generic](
    values: npt.NDArray[Number], groups: Sequence[Sequence[int]]
) -> npt.NDArray[Number]:
    """Sum over the parties of each list: dims (row, list)."""
    return np.stack([values[:, list(members)].sum(axis=1) for members in groups], axis=1)


def _group_lots(lot: npt.NDArray[np.floating], groups: Sequence[Sequence[int]]) -> npt.NDArray[np.floating]:
    """A ticket for each list: dims (row, list).

    Fractional part of the sum of the members' tickets: uniform like each of them, and the same in any order
    of the members.
    """
    return _group_sums(lot, groups) % 1
