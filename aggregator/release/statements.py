"""The days a table speaks of, and what holds on each: every date first, polling day last."""

from __future__ import annotations

from datetime import date

import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.release.table_words import Kind
from models.dimensions import DATE, PARTY


def days_and_kinds(draws: xr.Dataset, *, contest: Contest) -> list[tuple[date, Kind]]:
    """List the days of the draws, then polling day, with the kind of statement made about each."""
    dated = [(pd.Timestamp(day).date(), Kind.ON_DATE) for day in draws[DATE].values]
    return [*dated, (contest.last_polling_day, Kind.ON_POLLING_DAY)]


def values_by_day(draws: xr.Dataset, name: str, *, contest: Contest) -> list[xr.DataArray]:
    """Take the values of each day in the same order, each with its parties in the contest's order.

    Parameters
    ----------
    draws
        With a variable over dates and its twin of polling day, ``name`` and ``name_polling_day``.
    name
        The variable.
    contest
        Gives the order of the parties.
    """
    chosen = {PARTY: list(contest.party_codes)}
    dated = draws[name].sel(chosen)
    return [
        *(dated.isel({DATE: place}, drop=True) for place in range(dated.sizes[DATE])),
        draws[f"{name}_polling_day"].sel(chosen),
    ]
