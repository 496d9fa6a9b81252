"""Which way each house leans, era by era of its ways of working, and how noisy its polls are."""

from __future__ import annotations

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.release.draw_summaries import stack_samples, summarise_samples
from aggregator.release.lean_schemas import HOUSES
from models.dimensions import ERA, HOUSE, PARTY

POINTS = 100.0


def build_houses_table(draws: xr.Dataset) -> pd.DataFrame:
    """Summarise house effects, one row per way of working of a house and party.

    Houses are in alphabetical order, the ways of working of one house in the order of their last polls.

    Parameters
    ----------
    draws
        Posterior draws with ``era_lean`` and ``era_own_lean`` (chain, draw, era, party; 0 to 1), the
        coordinates ``era_house``, ``era_method``, ``era_mode``, ``era_population``, ``era_polls`` and
        ``era_last`` (era), ``design_effect`` (chain, draw, house) and ``usual_sample`` (house).

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``HOUSES``, leans in percentage points.
    """
    eras = _eras_in_order(draws)
    ordered = draws[["era_lean", "era_own_lean"]].sel({ERA: eras["era"].tolist()})
    parties = [str(code) for code in draws[PARTY].values]
    lean = summarise_samples(POINTS * stack_samples(ordered["era_lean"], dims=(ERA, PARTY)))
    own = summarise_samples(POINTS * stack_samples(ordered["era_own_lean"], dims=(ERA, PARTY)))
    houses = {HOUSE: eras["house"].tolist()}
    effect = stack_samples(draws["design_effect"].sel(houses), dims=(HOUSE,)).mean(axis=-1, dtype=np.float64)
    per_era = eras.assign(design_effect=effect, usual_sample=draws["usual_sample"].sel(houses).values).drop(
        columns=["era", "last"]
    )
    table = per_era.loc[per_era.index.repeat(len(parties))].reset_index(drop=True)
    return table.assign(
        code=parties * len(eras),
        lean=lean["mean"].ravel(),
        q05=lean["q05"].ravel(),
        q95=lean["q95"].ravel(),
        own_lean=own["mean"].ravel(),
        own_q05=own["q05"].ravel(),
        own_q95=own["q95"].ravel(),
    )[list(HOUSES.column_names)]


def _eras_in_order(draws: xr.Dataset) -> pd.DataFrame:
    eras = pd.DataFrame(
        {
            "era": draws[ERA].values.astype(str),
            "house": draws["era_house"].values.astype(str),
            "method": draws["era_method"].values.astype(str),
            "mode": draws["era_mode"].values.astype(str),
            "population": draws["era_population"].values.astype(str),
            "polls": draws["era_polls"].values.astype(int),
            "last": draws["era_last"].values,
        }
    )
    return (
        eras.assign(folded=eras["house"].str.casefold())
        .sort_values(["folded", "house", "last", "method"], kind="stable", ignore_index=True)
        .drop(columns="folded")
    )
