"""Chances of leading, of a majority alone, of one only as an alliance, and of none."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from aggregator.inputs.contest import Contest
from aggregator.release.codes import Code
from aggregator.release.draw_summaries import monte_carlo_error
from aggregator.release.likelihood_words import likelihood_word
from aggregator.release.rounding import CHANCE_DECIMALS, round_chance
from aggregator.release.seats_tables import majority_line, seats_in_chamber
from aggregator.release.table_schemas import CHANCES, Kind, Level, Outcome
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
    days = [pd.Timestamp(day).date() for day in draws[DATE].values]
    dated: list[tuple[date, Kind, xr.DataArray, xr.DataArray | None]] = [
        (
            day,
            Kind.ON_DATE,
            draws["national_support"].isel({DATE: place}),
            None if seats is None else seats["seats"].sel({DATE: draws[DATE].values[place]}),
        )
        for place, day in enumerate(days)
    ]
    dated.append(
        (
            contest.polling_day,
            Kind.ON_POLLING_DAY,
            draws["national_support_polling_day"],
            None if seats is None else seats["seats_polling_day"],
        )
    )
    majority = None if seats is None else majority_line(contest, chamber=seats_in_chamber(seats))
    labels: list[dict[str, object]] = []
    indicators: list[Indicator] = []
    for day, kind, support, drawn in dated:
        there = [code for code in codes if code.exists_on(day)]
        outcomes = _support_outcomes(support, there)
        if drawn is not None and majority is not None:
            outcomes += _seat_outcomes(drawn, there, majority)
        for outcome, code, indicator in outcomes:
            labels.append(
                {"date": np.datetime64(day, "s"), "kind": kind.value, "outcome": outcome.value, "code": code}
            )
            indicators.append(indicator)
    occurred = np.stack(indicators, axis=-1)
    samples = occurred.shape[0] * occurred.shape[1]
    table = pd.DataFrame(labels)
    table["probability"] = round_chance(occurred.mean(axis=(0, 1)), samples=samples)
    table["mc_error"] = np.maximum(monte_carlo_error(occurred), 10.0**-CHANCE_DECIMALS)
    table["likelihood"] = table["probability"].map(likelihood_word)
    return table[list(CHANCES.column_names)]


def _support_outcomes(support: xr.DataArray, codes: Sequence[Code]) -> list[tuple[Outcome, str, Indicator]]:
    parties = [code.code for code in codes if code.level is Level.PARTY]
    return [(Outcome.MOST_SUPPORT, code, lead) for code, lead in _leads(_by_party(support, parties), parties)]


def _seat_outcomes(
    seats: xr.DataArray, codes: Sequence[Code], majority: int
) -> list[tuple[Outcome, str, Indicator]]:
    parties = [code.code for code in codes if code.level is Level.PARTY]
    won = _by_party(seats, parties)
    alone = won >= majority
    reached = alone.any(axis=-1)
    outcomes: list[tuple[Outcome, str, Indicator]] = [
        (Outcome.LARGEST, code, lead) for code, lead in _leads(won, parties)
    ]
    outcomes += [
        (Outcome.MAJORITY_ALONE, code, alone[..., place].astype(np.float64))
        for place, code in enumerate(parties)
    ]
    for code in codes:
        if code.level is not Level.ALLIANCE:
            continue
        members = [parties.index(member) for member in code.members if member in parties]
        together = won[..., members].sum(axis=-1) >= majority
        only_together = together & ~alone[..., members].any(axis=-1)
        outcomes.append((Outcome.MAJORITY_ONLY_AS_ALLIANCE, code.code, only_together.astype(np.float64)))
        reached = reached | together
    outcomes.append((Outcome.NO_MAJORITY, "", (~reached).astype(np.float64)))
    return outcomes


def _by_party(drawn: xr.DataArray, parties: Sequence[str]) -> NDArray[np.generic]:
    """Values with shape (chain, draw, party)."""
    return drawn.sel({PARTY: list(parties)}).transpose(CHAIN, DRAW, PARTY).values


def _leads(values: NDArray[np.generic], parties: Sequence[str]) -> list[tuple[str, Indicator]]:
    """Whether each party has the highest value in each draw; k parties tied there count 1/k each."""
    top = values == values.max(axis=-1, keepdims=True)
    parts = top / top.sum(axis=-1, keepdims=True)
    return [(code, parts[..., place]) for place, code in enumerate(parties)]
