"""Which way each house leans, and how noisy its polls are."""

from __future__ import annotations

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.release.draw_summaries import stack_samples, summarise_samples
from aggregator.release.table_schemas import HOUSES
from models.dimensions import HOUSE, PARTY


def build_houses_table(draws: xr.Dataset) -> pd.DataFrame:
    """Summarise house effects, one row per house and party; houses in alphabetical order.

    Parameters
    ----------
    draws
        Posterior draws with ``house_lean`` (chain, draw, house, party; 0 to 1), ``design_effect`` (chain,
        draw, house), ``usual_sample`` and ``poll_count`` (house).

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``HOUSES``, leans in percentage points.
    """
    houses = sorted((str(house) for house in draws[HOUSE].values), key=lambda name: (name.casefold(), name))
    ordered = draws[["house_lean", "design_effect", "usual_sample", "poll_count"]].sel({HOUSE: houses})
    parties = [str(code) for code in draws[PARTY].values]
    lean = summarise_samples(100.0 * stack_samples(ordered["house_lean"], dims=(HOUSE, PARTY)))
    effect = stack_samples(ordered["design_effect"], dims=(HOUSE,)).mean(axis=-1, dtype=np.float64)
    count = len(parties)
    table = pd.DataFrame(
        {
            "house": np.repeat(np.array(houses, dtype=object), count),
            "method": "",
            "code": parties * len(houses),
            "lean": lean["mean"].ravel(),
            "q05": lean["q05"].ravel(),
            "q95": lean["q95"].ravel(),
            "polls": np.repeat(ordered["poll_count"].values, count),
            "design_effect": np.repeat(effect, count),
            "usual_sample": np.repeat(ordered["usual_sample"].values, count),
        }
    )
    return table[list(HOUSES.column_names)]
