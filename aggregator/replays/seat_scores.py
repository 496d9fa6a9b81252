"""Chances of single seats against who won them.

References
----------
.. [1] Brier, G. W. (1950). Verification of forecasts expressed in terms of probability. Monthly Weather
   Review 78, 1–3. The score is his original one, summed over the parties of a seat: 0 to 2.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np
import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.replays.methods import Method
from aggregator.replays.replayed_fit import ReplayedFit, as_of
from models.dimensions import DRAW, PARTY, SEAT

LISTED = ["contest", "as_of", "days_before", "method", "seat", "code", "chance", "won", "draws"]
_SCORED = ["contest", "as_of", "days_before", "method", "seats", "brier", "log_score", "leaders_wrong"]


def list_seat_chances(
    fits: Iterable[ReplayedFit],
    *,
    swing: Mapping[pd.Timestamp, Mapping[Method, pd.DataFrame]],
    won: pd.DataFrame,
    contest: Contest,
) -> pd.DataFrame:
    """Every chance that was given to a party in a seat, by every method that knows seats.

    Parameters
    ----------
    fits
        Fits with ``seat_chance`` (seat, party); those without are passed over.
    swing
        Each day's rivals: index seat, columns parties; 1 for the leader.
    won
        Who won each seat, 0 or 1, index seat, columns parties. Seats that a method does not know are left
        out for it.

    Returns
    -------
    pandas.DataFrame
        Columns ``LISTED``; ``draws`` is NaN for rivals, whose leader is sure.
    """
    tables = []
    for fit in fits:
        given = dict(swing.get(as_of(fit), {}))
        sizes = dict.fromkeys(given, np.nan)
        if "seat_chance" in fit.data:
            chance = fit.data["seat_chance"].transpose(SEAT, PARTY)
            given = {
                Method.FIELDFOLD: pd.DataFrame(
                    chance.to_numpy(),
                    [str(s) for s in chance[SEAT].values],
                    [str(p) for p in chance[PARTY].values],
                )
            } | given
            sizes[Method.FIELDFOLD] = float(fit.data.sizes[DRAW])
        left = (pd.Timestamp(contest.last_polling_day) - as_of(fit)).days
        for method, table in given.items():
            both = table.index.intersection(won.index, sort=False)
            chances = table.loc[both, won.columns]
            tables.append(
                pd.DataFrame(
                    {
                        "contest": contest.title,
                        "as_of": as_of(fit),
                        "days_before": left,
                        "method": str(method),
                        "seat": np.repeat(both.to_numpy(str), len(won.columns)),
                        "code": np.tile(won.columns.to_numpy(str), len(both)),
                        "chance": chances.to_numpy(float).ravel(),
                        "won": won.loc[both].to_numpy(float).ravel(),
                        "draws": sizes[method],
                    }
                )
            )
    return pd.concat(tables, ignore_index=True)[LISTED] if tables else pd.DataFrame(columns=LISTED)


def score_seats(chances: pd.DataFrame) -> pd.DataFrame:
    """Score chances by date and method.

    Parameters
    ----------
    chances
        Columns ``LISTED``.

    Returns
    -------
    pandas.DataFrame
        ``seats``; ``brier``, the mean over seats; ``log_score``, the mean of minus the logarithm of the
        winner's chance (blank for a method that is always sure: it would be infinite after one mistake);
        ``leaders_wrong``, seats whose likeliest party did not win.
    """
    if chances.empty:
        return pd.DataFrame(columns=_SCORED)
    keys = ["contest", "as_of", "days_before", "method"]
    # Never sure by a finite number of draws: (k + ½)/(S + 1), as chances are published.
    smooth = (chances["chance"] * chances["draws"] + 0.5) / (chances["draws"] + 1.0)
    scored = chances.assign(
        brier=(chances["chance"] - chances["won"]) ** 2,
        log_score=-np.log(smooth.to_numpy(float)) * chances["won"],
        led=chances["chance"].eq(chances.groupby([*keys, "seat"])["chance"].transform("max")),
    )
    # A lead shared by several counts as right in part.
    share = scored["led"] / scored.groupby([*keys, "seat"])["led"].transform("sum")
    scored = scored.assign(right=share * scored["won"])
    by_seat = scored.groupby([*keys, "seat"])[["brier", "log_score", "right"]].sum(min_count=1)
    grouped = by_seat.groupby(level=keys, sort=True)
    table = grouped[["brier", "log_score"]].mean()
    table["seats"] = grouped.size()
    table["leaders_wrong"] = table["seats"] - grouped["right"].sum()
    table.loc[table.index.get_level_values("method") != Method.FIELDFOLD, "log_score"] = np.nan
    return table.reset_index()[_SCORED]
