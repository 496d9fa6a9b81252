"""Seats by date and code, the chances that hang on them, and each seat's chances."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.release.code_summaries import summarise_codes
from aggregator.release.codes import Code
from aggregator.release.draw_summaries import stack_samples
from aggregator.release.rounding import round_chance
from aggregator.release.table_schemas import SEAT_CHANCES, SEATS
from aggregator.release.table_words import Kind
from models.dimensions import CHAIN, DATE, DRAW, PARTY, SEAT


def build_seats_table(seats: xr.Dataset, *, contest: Contest, codes: Sequence[Code]) -> pd.DataFrame:
    """Summarise seats on every date and on polling day.

    Parameters
    ----------
    seats
        Draws of seats: ``seats`` (chain, draw, date, party) and ``seats_polling_day`` (chain, draw, party).
    contest
        Says which alliances exist when.
    codes
        The codes to summarise, in the order of the rows; an alliance is summed draw by draw.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``SEATS``.
    """
    parties = [str(code) for code in seats[PARTY].values]
    days = [pd.Timestamp(day).date() for day in seats[DATE].values]
    over_time = summarise_codes(
        stack_samples(seats["seats"], dims=(DATE, PARTY)),
        days=days,
        parties=parties,
        codes=codes,
        kind=Kind.ON_DATE,
        whole=True,
    )
    final = summarise_codes(
        stack_samples(seats["seats_polling_day"], dims=(PARTY,))[None],
        days=[contest.last_polling_day],
        parties=parties,
        codes=codes,
        kind=Kind.ON_POLLING_DAY,
        whole=True,
    )
    return pd.concat([over_time, final], ignore_index=True)[list(SEATS.column_names)]


def build_seat_chances_table(seats: xr.Dataset) -> pd.DataFrame | None:
    """Each seat's chances on polling day, one row per seat or district and party that stands there.

    Parameters
    ----------
    seats
        With ``seat_chance``, ``seat_share``, ``last_share`` (0 to 1) and ``seat_expected`` (members), dims
        (seat, party), and the coordinates ``seat_name``, ``seat_region`` and ``seat_magnitude``.

    Returns
    -------
    pandas.DataFrame or None
        Columns of the schema ``SEAT_CHANCES``; None where lists fill all seats, by region or in all.
    """
    if "seat_chance" not in seats:
        return None
    samples = seats.sizes[CHAIN] * seats.sizes[DRAW]
    parties = [str(code) for code in seats[PARTY].values]
    share = seats["seat_share"].transpose(SEAT, PARTY).values.astype(np.float64)
    last = seats["last_share"].transpose(SEAT, PARTY).values.astype(np.float64)
    chance = seats["seat_chance"].transpose(SEAT, PARTY).values.astype(np.float64)
    expected = seats["seat_expected"].transpose(SEAT, PARTY).values.astype(np.float64)
    count = len(parties)
    table = pd.DataFrame(
        {
            "seat": np.repeat(seats[SEAT].values.astype(str), count),
            "name": np.repeat(seats["seat_name"].values.astype(str), count),
            "region": np.repeat(seats["seat_region"].values.astype(str), count),
            "code": parties * seats.sizes[SEAT],
            "last_share": np.where(last > 0, 100.0 * last, np.nan).ravel(),
            "expected_share": (100.0 * share).ravel(),
            "chance": round_chance(chance, samples=samples).ravel(),
            "members": np.repeat(seats["seat_magnitude"].values.astype(np.float64), count),
            "expected_members": expected.ravel(),
        }
    )
    stands = (np.nan_to_num(share) > 0).ravel()
    return table.loc[stands, list(SEAT_CHANCES.column_names)].reset_index(drop=True)


def mean_list_seats(seats: xr.Dataset, *, codes: Sequence[Code]) -> dict[str, float] | None:
    """Mean number of each code's seats on polling day that come from lists; None where no rule is mixed.

    Parameters
    ----------
    seats
        With ``list_seats_polling_day`` (chain, draw, party) in a mixed chamber.
    codes
        The codes there are; an alliance has the list seats of its members.
    """
    if "list_seats_polling_day" not in seats:
        return None
    mean = seats["list_seats_polling_day"].mean((CHAIN, DRAW))
    return {code.code: float(mean.sel({PARTY: list(code.members)}).sum()) for code in codes}
