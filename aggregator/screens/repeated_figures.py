r"""Two polls that print the same figures.

Few parties in whole points repeat easily, many with a decimal hardly ever. Two honest polls of :math:`n_1`
and :math:`n_2` respondents with steps of rounding :math:`g_1, g_2` print the same d free figures with a
chance of at most about

.. math:: \min(g_1, g_2)^d \, (2\pi)^{-d/2} \, |V|^{-1/2}, \qquad
          V = \Big(\frac1{n_1} + \frac1{n_2}\Big) (\mathrm{diag}(p) - p p^\top) + \frac{g_1^2 + g_2^2}{12} I,

the chance that the difference of two rounded normal vectors is zero where opinion was the same for both. It
is less where opinion or leans differ, or where the design effect is above 1. A question is asked of the
pairs so improbable that all pairs of the register at most as probable would give one such repetition in no
more than one of twenty honest registers, half of it for pairs within a house and half for pairs between
houses. (That sum bounds the chance of any needless question: Bonferroni's inequality.)
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd

from aggregator.screens.questions import JOINER, LEVEL, Question, Screen, joined_polls

Floats = npt.NDArray[np.float64]

# Shares are rescaled when the undecided are set aside: equal figures are equal to this many decimals.
_DECIMALS = 6


@dataclass(frozen=True)
class _Pairs:
    """Pairs of rows that could repeat each other: places, chance, whether they do, whether of one house."""

    first: npt.NDArray[np.int64]
    second: npt.NDArray[np.int64]
    chance: Floats
    same_figures: npt.NDArray[np.bool_]
    same_house: npt.NDArray[np.bool_]


def ask_about_repeated_figures(polls: pd.DataFrame, *, codes: Sequence[str]) -> list[Question]:
    """Ask where two polls print the same figures and chance would hardly do it.

    Parameters
    ----------
    polls
        As ``DeskInputs.polls``.
    codes
        Columns with shares.
    """
    rows = polls.reset_index(drop=True)
    pairs = _pairs(rows, codes)
    questions = []
    for same_house in (True, False):
        chosen = pairs.same_house == same_house
        chances = np.sort(pairs.chance[chosen])
        expected = np.cumsum(chances)
        asked = chosen & pairs.same_figures
        for group in _groups(pairs, asked):
            chance = min(pairs.chance[i] for i in group)
            as_rare = float(expected[np.searchsorted(chances, chance, side="right") - 1])
            if as_rare <= LEVEL / 2:
                questions.append(_question(rows, pairs, group, chance=chance, as_rare=as_rare))
    return questions


def repetition_chance(share: Floats, *, respondents: Floats, step: Floats) -> Floats:
    """Chance that two polls print the same figures, if opinion was the same.

    Parameters
    ----------
    share
        Shares 0–1 whose sum is free, dims (pair, code).
    respondents, step
        Respondents and step of rounding (0–1), dims (pair, 2).
    """
    size = (1 / respondents).sum(axis=1)[:, None]
    diagonal = size * share + (step**2).sum(axis=1)[:, None] / 12
    # Determinant of a diagonal matrix less a vector times itself.
    less = 1 - (size * share**2 / diagonal).sum(axis=1)
    log_determinant = np.log(diagonal).sum(axis=1) + np.log(less)
    # A share of n people is a multiple of 1/n, which may be coarser than the step of rounding.
    finest = np.maximum(step, 1 / respondents).min(axis=1)
    free = share.shape[1]
    log_chance = free * (np.log(finest) - np.log(2 * np.pi) / 2) - log_determinant / 2
    return np.minimum(1, np.exp(log_chance))


def _pairs(rows: pd.DataFrame, codes: Sequence[str]) -> _Pairs:
    offered = rows[[*codes, "remainder"]].notna().apply(tuple, axis=1)
    parts = [
        _pairs_of(group, codes)
        for _, group in rows.groupby([rows["regions"].map(frozenset), offered], sort=False)
        if len(group) > 1
    ]
    if not parts:
        none = np.empty(0, dtype=np.int64)
        return _Pairs(none, none, np.empty(0), none.astype(bool), none.astype(bool))
    return _Pairs(*(np.concatenate([getattr(p, name) for p in parts]) for name in _Pairs.__annotations__))


def _pairs_of(group: pd.DataFrame, codes: Sequence[str]) -> _Pairs:
    """Pairs of rows that asked in the same regions and offered the same codes."""
    one, other = np.triu_indices(len(group), 1)
    house, poll = group["house"].to_numpy(str), group["poll"].to_numpy(str)
    start, end = group["start"].to_numpy(), group["end"].to_numpy()
    same_house = house[one] == house[other]
    shares_interviews = same_house & (start[one] <= end[other]) & (start[other] <= end[one])
    compared = ~shares_interviews & (poll[one] != poll[other])
    one, other, same_house = one[compared], other[compared], same_house[compared]
    given = [code for code in codes if group[code].notna().any()]
    figures = np.round(group[[*given, "remainder"]].to_numpy(float), _DECIMALS)
    figures[:, -1] = np.nan_to_num(figures[:, -1], nan=-1.0)
    middle = (figures[one, :-1] + figures[other, :-1]) / 200
    if group["remainder"].isna().all():
        # The figures make the whole: the smallest of them is what the others leave.
        middle = -np.sort(-middle, axis=1)[:, :-1]
    pair = np.column_stack([one, other])
    return _Pairs(
        first=group.index.to_numpy()[one],
        second=group.index.to_numpy()[other],
        chance=repetition_chance(
            middle,
            respondents=group["respondents"].to_numpy(float)[pair],
            step=group["rounding_step"].to_numpy(float)[pair] / 100,
        ),
        same_figures=(figures[one] == figures[other]).all(axis=1),
        same_house=same_house,
    )


def _groups(pairs: _Pairs, asked: npt.NDArray[np.bool_]) -> list[list[int]]:
    """Pairs that print one and the same set of figures, together."""
    groups: dict[int, list[int]] = {}
    leader: dict[int, int] = {}
    for pair in np.flatnonzero(asked).tolist():
        first, second = int(pairs.first[pair]), int(pairs.second[pair])
        lead = leader.get(first, leader.get(second, first))
        leader[first] = leader[second] = lead
        groups.setdefault(lead, []).append(pair)
    return list(groups.values())


def _question(
    rows: pd.DataFrame, pairs: _Pairs, group: list[int], *, chance: float, as_rare: float
) -> Question:
    places = sorted({int(p) for i in group for p in (pairs.first[i], pairs.second[i])})
    polls, houses = rows["poll"].iloc[places], list(dict.fromkeys(rows["house"].iloc[places]))
    found = (
        f"the same figures in {len(places)} polls, {_days(rows.iloc[places])} days apart; chance "
        f"{chance:.1g} for a pair"
    )
    usual = f"{as_rare:.1g} such repetitions in the whole register"
    if len(houses) == 1:
        question = (
            "Is it one poll entered twice, perhaps for two sponsors or as a correction? Or could figures "
            "have been carried over from one poll to the next, or a shared sample counted in both?"
        )
    else:
        question = (
            "Is it one poll entered under two names, or one set of interviews that the houses share? Or "
            "could the figures of one have slipped into the row of the other?"
        )
    return Question(
        Screen.REPEATED_FIGURES, JOINER.join(houses), "", joined_polls(polls), found, usual, question
    )


def _days(rows: pd.DataFrame) -> int:
    return int((rows["end"].max() - rows["end"].min()).days)
