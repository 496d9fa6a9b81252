"""Chances of leading, of a majority alone, of one only as an alliance, and of none."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from aggregator.inputs.contest import Contest
from aggregator.release.codes import Code
from aggregator.release.draw_summaries import monte_carlo_error
from aggregator.release.likelihood_words import likelihood_word
from aggregator.release.rounding import SMALLEST_CHANCE, round_chance
from aggregator.release.seats_tables import majority_line, seats_in_chamber
from aggregator.release.table_schemas import CHANCES
from aggregator.release.table_words import Kind, Level, Outcome
from models.dimensions import CHAIN, DATE, DRAW, PARTY

Indicator = NDArray[np.float64]
"""Whether an outcome occurred in each draw, shape (chain, draw); parts of one where a lead is tied."""


def build_chances_table(
    draws: xr.Dataset, *, seats: xr.Dataset | None, contest: Contest, codes: Sequence[Code]
) -> pd.DataFrame:
    """Chances on every date and on polling day.

    Parameters
    ----------
    draws
        Posterior draws with ``national_support`` and ``national_support_polling_day``.
    seats
        Draws of seats; None where nothing is counted in seats, and then only ``most_support`` has rows.
    contest
        Gives polling day, the majority line and the alliances' dates.
    codes
        All codes; the order of the rows.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``CHANCES``.
    """
    parties = [code for code in codes if code.level is Level.PARTY]
    support = _with_polling_day(draws, "national_support", parties)
    won = None if seats is None else _with_polling_day(seats, "seats", parties)
    majority = None if seats is None else majority_line(contest, chamber=seats_in_chamber(seats))
    days = [pd.Timestamp(day).date() for day in draws[DATE].values]
    kinds = [Kind.ON_DATE] * len(days) + [Kind.ON_POLLING_DAY]
    labels: list[dict[str, object]] = []
    indicators: list[Indicator] = []
    for place, (day, kind) in enumerate(zip([*days, contest.polling_day], kinds, strict=True)):
        there = [code for code in codes if code.exists_on(day)]
        outcomes = _leads(Outcome.MOST_SUPPORT, support[place], parties)
        if won is not None and majority is not None:
            outcomes += _seat_outcomes(won[place], parties, there, majority)
        for outcome, code, indicator in outcomes:
            labels.append(
                {"date": np.datetime64(day, "s"), "kind": kind.value, "outcome": outcome.value, "code": code}
            )
            indicators.append(indicator)
    occurred = np.stack(indicators, axis=-1)
    samples = occurred.shape[0] * occurred.shape[1]
    table = pd.DataFrame(labels)
    table["probability"] = round_chance(occurred.mean(axis=(0, 1)), samples=samples)
    table["mc_error"] = np.maximum(monte_carlo_error(occurred), SMALLEST_CHANCE)
    table["likelihood"] = table["probability"].map(likelihood_word)
    return table[list(CHANCES.column_names)]


def _with_polling_day(draws: xr.Dataset, name: str, parties: Sequence[Code]) -> NDArray[Any]:
    """Values with shape (date, chain, draw, party), polling day as the last date; others left out."""
    chosen = {PARTY: [code.code for code in parties]}
    dated = draws[name].sel(chosen).transpose(DATE, CHAIN, DRAW, PARTY).values
    final = draws[f"{name}_polling_day"].sel(chosen).transpose(CHAIN, DRAW, PARTY).values
    return np.concatenate([dated, final[None]])


def _seat_outcomes(
    won: NDArray[Any], parties: Sequence[Code], codes: Sequence[Code], majority: int
) -> list[tuple[Outcome, str, Indicator]]:
    """Outcomes of one day from seats with shape (chain, draw, party)."""
    place = {code.code: index for index, code in enumerate(parties)}
    alone = won >= majority
    reached = alone.any(axis=-1)
    outcomes = _leads(Outcome.LARGEST, won, parties)
    outcomes += [
        (Outcome.MAJORITY_ALONE, code.code, alone[..., place[code.code]].astype(np.float64))
        for code in parties
    ]
    for code in codes:
        if code.level is not Level.ALLIANCE:
            continue
        members = [place[member] for member in code.members if member in place]
        together = won[..., members].sum(axis=-1) >= majority
        only_together = together & ~alone[..., members].any(axis=-1)
        outcomes.append((Outcome.MAJORITY_ONLY_AS_ALLIANCE, code.code, only_together.astype(np.float64)))
        reached = reached | together
    outcomes.append((Outcome.NO_MAJORITY, "", (~reached).astype(np.float64)))
    return outcomes


def _leads(
    outcome: Outcome, values: NDArray[Any], parties: Sequence[Code]
) -> list[tuple[Outcome, str, Indicator]]:
    """Whether each party has the highest value in each draw; k parties tied there count 1/k each."""
    top = values == values.max(axis=-1, keepdims=True)
    parts = top / top.sum(axis=-1, keepdims=True)
    return [(outcome, code.code, parts[..., place]) for place, code in enumerate(parties)]
