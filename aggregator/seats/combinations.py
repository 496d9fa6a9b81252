"""Which parties reach a majority together, and who of them could be spared.

A combination counts here where it is *minimal*: it reaches the majority line, and without any one of its
members it would not. A party with a majority by itself is a minimal combination of one. Whether its members
would ever work together is not asked: this is arithmetic.

References
----------
von Neumann, J. and Morgenstern, O. (1944). Theory of Games and Economic Behavior, chapter 10 (minimal winning
coalitions). Princeton University Press.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import xarray as xr
from numba import njit, prange

from aggregator.seats.majorities import REAL_CHANCE, parties_and_holdings
from models.dimensions import CHAIN, DRAW, PARTY

COMBINATION = "combination"
"""Dim: combinations of parties, named by their codes joined by ``JOINED_BY``."""
JOINED_BY = "+"
MOST_COMBINATIONS = 100
"""The likeliest are kept: a chamber of a dozen even parties has thousands."""
MOST_PARTIES = 16
"""Parties that may enter a combination, those with most seats; each more doubles the combinations."""


def find_combinations(
    seats: xr.DataArray, *, majority: npt.ArrayLike, least_chance: float = REAL_CHANCE
) -> xr.Dataset:
    """Find the combinations that are minimal with some chance, and what they hold draw by draw.

    Parameters
    ----------
    seats
        Seats on one day, dims (chain, draw, party), any order.
    majority
        Seats that make a majority, above zero: one number, or dims (chain, draw).
    least_chance
        Smallest part of the draws in which a combination must be minimal; of more than
        ``MOST_COMBINATIONS`` the likeliest are kept.

    Returns
    -------
    xr.Dataset
        ``held`` (combination, chain, draw), int32: seats of its members together; ``reaches`` and ``minimal``
        (the same dims): whether they make a majority, and whether each of them is needed for it;
        ``member`` (combination, party). The likeliest minimal combination comes first, and of those as
        likely the one named first. Others never enter.
    """
    parties, won = parties_and_holdings(seats)
    shape = won.shape[:2]
    line = np.broadcast_to(np.asarray(majority, dtype=np.int64), shape)
    enter = np.sort(np.argsort(-won.mean(axis=(0, 1)), kind="stable")[:MOST_PARTIES])
    flat = np.ascontiguousarray(won[..., enter].reshape(-1, enter.size), dtype=np.int64)
    counts = _count_minimal(flat, np.ascontiguousarray(line.reshape(-1)))
    often = np.flatnonzero(counts >= least_chance * flat.shape[0])
    often = often[counts[often] > 0]
    chosen = often[np.argsort(-counts[often], kind="stable")][:MOST_COMBINATIONS]
    member = np.zeros((chosen.size, len(parties)), dtype=bool)
    member[:, enter] = (chosen[:, None] >> np.arange(enter.size)) & 1
    return _describe(won.astype(np.int32), member, line=line, parties=parties)


def _describe(
    won: npt.NDArray[np.int32],
    member: npt.NDArray[np.bool_],
    *,
    line: npt.NDArray[np.int64],
    parties: list[str],
) -> xr.Dataset:
    """What each combination holds, and whether it is minimal; ``won`` has dims (chain, draw, party)."""
    held = np.moveaxis(won @ member.T.astype(np.int32), -1, 0)
    fewest = np.stack([won[..., of].min(axis=-1) for of in member]) if len(member) else held
    reaches = held >= line
    dims = (COMBINATION, CHAIN, DRAW)
    return xr.Dataset(
        {
            "held": (dims, held),
            "reaches": (dims, reaches),
            # Without the member that holds fewest it must fall short; then it does without any other too.
            "minimal": (dims, reaches & (held - fewest < line)),
            "member": ((COMBINATION, PARTY), member),
        },
        coords={
            PARTY: parties,
            COMBINATION: [JOINED_BY.join(np.asarray(parties)[of]) for of in member],
        },
    )


def _count_minimal(won: npt.NDArray[np.int64], line: npt.NDArray[np.int64]) -> npt.NDArray[np.int64]:
    """Draws in which each combination is minimal; its place is the sum of 2**p over its members p."""
    order = np.argsort(-won, axis=1, kind="stable")
    ranked = np.take_along_axis(won, order, axis=1)
    after = np.flip(np.cumsum(np.flip(ranked, axis=1), axis=1), axis=1)
    parts = _walk_draws(ranked, after, order, line)
    total: npt.NDArray[np.int64] = parts.sum(axis=0)
    return total


WORKERS = 8
"""Parts that the draws are dealt out in; the sum over parts is the same for any number."""


# Members are added from the largest down, so the last one added is the smallest: the sum passes the line with
# it and not before, and the combination is minimal. Every branch that cannot reach the line is left at once.
@njit(parallel=True, cache=True)
def _walk_draws(ranked, after, order, line):  # type: ignore[no-untyped-def]
    n_draws, n_parties = ranked.shape
    found = np.zeros((WORKERS, 1 << n_parties), dtype=np.int64)
    for worker in prange(WORKERS):
        path = np.empty(n_parties + 1, dtype=np.int64)
        for draw in range(worker, n_draws, WORKERS):
            depth, place, held, mask = 0, 0, 0, 0
            while True:
                if place < n_parties and held + after[draw, place] >= line[draw]:
                    if held + ranked[draw, place] >= line[draw]:
                        found[worker, mask | (1 << order[draw, place])] += 1
                        place += 1
                        continue
                    path[depth] = place
                    depth += 1
                    held += ranked[draw, place]
                    mask |= 1 << order[draw, place]
                    place += 1
                    continue
                if depth == 0:
                    break
                depth -= 1
                place = path[depth]
                held -= ranked[draw, place]
                mask &= ~(1 << order[draw, place])
                place += 1
    return found
