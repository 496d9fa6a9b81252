"""Support by date, region and code."""

from __future__ import annotations

from collections.abc import Sequence

import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.release.code_summaries import summarise_codes
from aggregator.release.codes import Code
from aggregator.release.draw_summaries import stack_samples
from aggregator.release.table_schemas import SUPPORT
from aggregator.release.table_words import Kind
from models.dimensions import DATE, PARTY, REGION

COUNTRY = ""
"""What stands in the column ``region`` for the whole country."""
PERCENT = 100


def build_support_table(draws: xr.Dataset, *, contest: Contest, codes: Sequence[Code]) -> pd.DataFrame:
    """Summarise support on every date and on polling day, for the country and every region.

    A party has no row in a region where it does not stand, an alliance none where no member does. A
    contest without regions has rows for the country only.

    Parameters
    ----------
    draws
        Posterior draws with ``support``, ``support_polling_day``, ``national_support`` and
        ``national_support_polling_day``; shares from 0 to 1.
    contest
        Says which alliances exist when, who stands where and when each region votes.
    codes
        The codes to summarise, in the order of the rows.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``SUPPORT``, shares in percent; by kind, then date, then region.
    """
    parties = [str(code) for code in draws[PARTY].values]
    days = [pd.Timestamp(day).date() for day in draws[DATE].values]
    regions = (COUNTRY, *(region.code for region in contest.regions))
    over_time, final = [], []
    for region in regions:
        there = draws if region == COUNTRY else draws.sel({REGION: region})
        name = "national_support" if region == COUNTRY else "support"
        vote = contest.last_polling_day if region == COUNTRY else contest.polling_day_of(region)
        standing = [
            code
            for code in codes
            if region == COUNTRY or any(contest.stands_in(member, region) for member in code.members)
        ]
        dated = stack_samples(there[name], dims=(DATE, PARTY)) * PERCENT
        voted = stack_samples(there[f"{name}_polling_day"], dims=(PARTY,))[None] * PERCENT
        over_time.append(
            summarise_codes(dated, days=days, parties=parties, codes=standing, kind=Kind.ON_DATE).assign(
                region=region
            )
        )
        final.append(
            summarise_codes(
                voted, days=[vote], parties=parties, codes=standing, kind=Kind.ON_POLLING_DAY
            ).assign(region=region)
        )
    # A stable sort by date alone keeps regions and codes in the order in which they were put together.
    ordered = [pd.concat(blocks).sort_values("date", kind="stable") for blocks in (over_time, final)]
    return pd.concat(ordered, ignore_index=True)[list(SUPPORT.column_names)]
