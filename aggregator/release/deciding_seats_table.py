"""Which seats decide whether a party or an alliance has a majority."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest, CountingRule
from aggregator.release.chamber import sizes_in_draws
from aggregator.release.codes import Code
from aggregator.release.likelihood_words import NAMED_LEADER_FROM
from aggregator.release.rounding import round_chance
from aggregator.release.table_schemas import DECIDING_SEATS
from aggregator.seats.deciding_seats import find_deciding_seats, single_member_seats
from aggregator.seats.majorities import codes_near_majority, majority_line
from models.dimensions import CHAIN, DRAW, PARTY, SEAT

PERCENT = 100.0


def build_deciding_seats_table(
    seats: xr.Dataset,
    *,
    contest: Contest,
    codes: Sequence[Code],
    counted_result: pd.DataFrame | None = None,
) -> pd.DataFrame | None:
    """Summarise each seat that elects one member, for each code with a real chance of a majority.

    Parameters
    ----------
    seats
        Draws of seats, with ``won`` and ``seat_votes`` (chain, draw, seat, party).
    contest
        Gives the majority line and the rule of each region.
    codes
        The codes there are, in the order of the rows.
    counted_result
        Votes of the seats that have been counted: nothing is open there, and so they decide nothing.

    Returns
    -------
    pandas.DataFrame or None
        Columns of the schema ``DECIDING_SEATS``, without rows where no code has a real chance; None where no
        seats of one member are filled whose winner adds a seat to its party.
    """
    if "won" not in seats or "seat_votes" not in seats:
        return None
    among = single_member_seats(seats) & ~_made_up_for(seats, contest)
    if counted_result is not None:
        among &= ~seats[SEAT].isin(counted_result["seat"].astype(str).tolist()).to_numpy()
    if not among.any():
        return None
    won = seats["seats_polling_day"]
    line = majority_line(contest, chamber=sizes_in_draws(won))
    active = [each for each in contest.alliances if each.active_on(contest.last_polling_day)]
    near = codes_near_majority(won, alliances=active, majority=line)
    tables = [_of_code(seats, code=code, line=line, among=among) for code in codes if code.code in near]
    empty = pd.DataFrame({name: pd.Series(dtype="str") for name in DECIDING_SEATS.column_names})
    return pd.concat(tables, ignore_index=True) if tables else empty


def _made_up_for(seats: xr.Dataset, contest: Contest) -> npt.NDArray[np.bool_]:
    """Seats of regions where list seats make up for seats won, by position."""
    regions = [
        region
        for terms, regions in contest.counting_groups
        if terms.rule is CountingRule.MIXED_COMPENSATORY
        for region in regions
    ]
    within: npt.NDArray[np.bool_] = seats["seat_region"].isin(regions).to_numpy()
    return within


def _of_code(
    seats: xr.Dataset, *, code: Code, line: npt.NDArray[np.int64], among: npt.NDArray[np.bool_]
) -> pd.DataFrame:
    found = find_deciding_seats(seats, members=code.members, majority=line, among=among)
    samples = seats.sizes[CHAIN] * seats.sizes[DRAW]
    there = seats.isel({SEAT: np.flatnonzero(among)})
    surest = round_chance(there["seat_chance"].max(PARTY).to_numpy(), samples=samples)
    table = pd.DataFrame(
        {
            "seat": there[SEAT].to_numpy().astype(str),
            "name": there["seat_name"].to_numpy().astype(str),
            "region": there["seat_region"].to_numpy().astype(str),
            "code": code.code,
            "level": code.level.value,
            "chance": round_chance(found["chance"].to_numpy(), samples=samples),
            "decides": found["decides"].to_numpy(),
            "carries": PERCENT * found["carries"].to_numpy(),
            "too_close": np.where(surest < NAMED_LEADER_FROM, "yes", "no"),
        }
    )
    return table.loc[found["stands"].to_numpy(), list(DECIDING_SEATS.column_names)]
