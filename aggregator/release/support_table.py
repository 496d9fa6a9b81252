"""Support by date, region and code."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import date

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from aggregator.inputs.contest import Contest
from aggregator.release.codes import Code
from aggregator.release.draw_summaries import stack_samples, summarise_samples
from aggregator.release.table_schemas import SUPPORT, Kind
from models.dimensions import DATE, PARTY, REGION

COUNTRY = ""
"""What stands in the column ``region`` for the whole country."""


def build_support_table(draws: xr.Dataset, *, contest: Contest, codes: Sequence[Code]) -> pd.DataFrame:
    """Summarise support on every date and on polling day, for the country and every region.

    An alliance is summed draw by draw, on the days on which it exists. A party has no row in a region where
    it does not stand. A contest without regions has rows for the country only.

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
        Columns of the schema ``SUPPORT``, shares in percent.
    """
    parties = [str(code) for code in draws[PARTY].values]
    days = [pd.Timestamp(day).date() for day in draws[DATE].values]
    regions = list(contest.region_codes) if contest.regions else []
    blocks = []
    for region in (COUNTRY, *regions):
        over_time, at_poll = (
            (draws["national_support"], draws["national_support_polling_day"])
            if region == COUNTRY
            else (draws["support"].sel({REGION: region}), draws["support_polling_day"].sel({REGION: region}))
        )
        standing = [
            code
            for code in codes
            if region == COUNTRY or any(contest.stands_in(member, region) for member in code.members)
        ]
        vote = contest.polling_day if region == COUNTRY else contest.polling_day_of(region)
        blocks.append(
            _summarise_block(
                stack_samples(over_time, dims=(DATE, PARTY)),
                days,
                parties,
                standing,
                region,
                Kind.ON_DATE,
                codes,
            )
        )
        blocks.append(
            _summarise_block(
                stack_samples(at_poll, dims=(PARTY,))[None],
                [vote],
                parties,
                standing,
                region,
                Kind.ON_POLLING_DAY,
                codes,
            )
        )
    table = pd.concat(blocks, ignore_index=True)
    region_place = {region: place for place, region in enumerate((COUNTRY, *regions))}
    table["_region"] = table["region"].map(region_place)
    table["_kind"] = table["kind"].map({Kind.ON_DATE.value: 0, Kind.ON_POLLING_DAY.value: 1})
    table = table.sort_values(["_kind", "date", "_region", "_code"], kind="stable")
    return table[list(SUPPORT.column_names)].reset_index(drop=True)


def _summarise_block(
    samples: NDArray[np.generic],
    days: Sequence[date],
    parties: Sequence[str],
    standing: Sequence[Code],
    region: str,
    kind: Kind,
    codes: Sequence[Code],
) -> pd.DataFrame:
    """Rows of one region and kind; ``samples`` has shape (date, party, sample)."""
    place = {code: index for index, code in enumerate(parties)}
    order = {code.code: index for index, code in enumerate(codes)}
    columns = [
        samples[:, place[code.code]]
        if len(code.members) == 1
        else samples[:, [place[m] for m in code.members]].sum(axis=1)
        for code in standing
    ]
    summary = summarise_samples(100.0 * np.stack(columns, axis=1))
    exists = np.array([[code.exists_on(day) for code in standing] for day in days]).ravel()
    rows = pd.DataFrame(
        {
            "date": np.repeat(np.array(days, dtype="datetime64[s]"), len(standing)),
            "region": region,
            "code": [code.code for code in standing] * len(days),
            "level": [code.level.value for code in standing] * len(days),
            "kind": kind.value,
            **{name: values.ravel() for name, values in summary.items()},
            "_code": [order[code.code] for code in standing] * len(days),
        }
    )
    return rows[exists]
