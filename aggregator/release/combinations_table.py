"""Which parties reach the majority line together, on every date and on polling day."""

from __future__ import annotations

from datetime import date

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.release.chamber import sizes_in_draws
from aggregator.release.draw_summaries import stack_samples, summarise_samples
from aggregator.release.likelihood_words import likelihood_word
from aggregator.release.rounding import SMALLEST_CHANCE, round_chance
from aggregator.release.statements import days_and_kinds, values_by_day
from aggregator.release.table_schemas import COMBINATIONS
from aggregator.release.table_words import Kind
from aggregator.seats.combinations import COMBINATION, JOINED_BY, find_combinations
from aggregator.seats.majorities import majority_line, monte_carlo_error
from models.dimensions import CHAIN, DRAW


def build_combinations_table(seats: xr.Dataset, *, contest: Contest) -> pd.DataFrame:
    """Summarise the combinations that are minimal with some chance, day by day, likeliest first.

    Parameters
    ----------
    seats
        Draws of seats: ``seats`` (chain, draw, date, party) and ``seats_polling_day`` (chain, draw, party).
    contest
        Gives the order of the parties, the majority line and the alliances of a day.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``COMBINATIONS``; without rows where nobody can reach the line.
    """
    held = values_by_day(seats, "seats", contest=contest)
    days = days_and_kinds(seats, contest=contest)
    tables = [
        _of_day(won, day=day, kind=kind, contest=contest) for won, (day, kind) in zip(held, days, strict=True)
    ]
    return pd.concat(tables, ignore_index=True)[list(COMBINATIONS.column_names)]


def _of_day(won: xr.DataArray, *, day: date, kind: Kind, contest: Contest) -> pd.DataFrame:
    found = find_combinations(won, majority=majority_line(contest, chamber=sizes_in_draws(won)))
    names = [str(name) for name in found[COMBINATION].values]
    samples = won.sizes[CHAIN] * won.sizes[DRAW]
    held = summarise_samples(stack_samples(found["held"], dims=(COMBINATION,)), whole=True)
    reaches = found["reaches"].transpose(CHAIN, DRAW, COMBINATION).to_numpy()
    chance = round_chance(reaches.mean(axis=(0, 1)), samples=samples)
    minimal = found["minimal"].mean((CHAIN, DRAW)).to_numpy()
    alliances = {frozenset(each.members): each.code for each in contest.alliances if each.active_on(day)}
    return pd.DataFrame(
        {
            "date": np.full(len(names), np.datetime64(day, "s")),
            "kind": kind.value,
            "combination": pd.Series(names, dtype="str"),
            "alliance": pd.Series(
                [alliances.get(frozenset(name.split(JOINED_BY)), "") for name in names], dtype="str"
            ),
            "parties": found["member"].sum("party").to_numpy().astype(float),
            "chance": chance,
            "chance_minimal": round_chance(minimal, samples=samples),
            "mc_error": np.maximum(monte_carlo_error(reaches), SMALLEST_CHANCE),
            "likelihood": pd.Series([likelihood_word(each) for each in chance], dtype="str"),
            **{name: held[name] for name in ("mean", "q05", "q95")},
        }
    )
