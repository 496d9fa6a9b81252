"""One fit of an invented election, number by number, against the truth."""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.replays.distribution_scores import (
    INTERVALS,
    central_intervals,
    place_of_truth,
    score_crps,
)
from aggregator.replays.replayed_fit import ReplayedFit
from aggregator.studies.invented_elections import COUNTRY, InventedElection, Quantity
from aggregator.studies.whitening import whitened_errors
from models.dimensions import DRAW, PARTY, REGION, SEAT

JUDGED_COLUMNS = (
    *("election", "quantity", "region", "code", "estimate", "truth", "crps", "place"),
    *(f"inside_{percent}" for percent in INTERVALS),
    *(f"width_{percent}" for percent in INTERVALS),
)


def judge_fit(election: InventedElection, fit: ReplayedFit, *, rng: np.random.Generator) -> pd.DataFrame:
    """Hold every estimate against the truth.

    Parameters
    ----------
    rng
        Places the truth within its step where draws equal it.

    Returns
    -------
    pandas.DataFrame
        Columns ``JUDGED_COLUMNS``, one row per quantity, region and code that was estimated. Estimate (the
        mean of the draws), truth, CRPS and widths are percent or seats; ``place`` is the truth's among the
        draws, 0–1, uniform where all is right.
    """
    tables = []
    for quantity, truth in election.truth.groupby("quantity", sort=False):
        drawn = draws_of(fit, Quantity(str(quantity)))
        if drawn is None:
            continue
        draws = drawn[pd.MultiIndex.from_frame(truth[["region", "code"]])].to_numpy()
        true = truth["truth"].to_numpy()
        intervals = central_intervals(draws, whole=quantity == Quantity.SEATS)
        tables.append(
            truth.assign(
                election=election.seed,
                estimate=draws.mean(axis=0),
                crps=score_crps(draws, true),
                place=place_of_truth(draws, true, rng=rng),
                **{f"inside_{p}": (low <= true) & (true <= high) for p, (low, high) in intervals.items()},
                **{f"width_{p}": high - low for p, (low, high) in intervals.items()},
            )
        )
    return pd.concat(tables, ignore_index=True)[list(JUDGED_COLUMNS)]


def draws_of(fit: ReplayedFit, quantity: Quantity) -> pd.DataFrame | None:
    """Draws of a quantity in its unit: one row per draw, columns (region, code); None where not estimated."""
    data = fit.data
    if quantity is Quantity.SEATS:
        return _by_party(fit, "seats_polling_day") if "seats_polling_day" in data else None
    if quantity is Quantity.SUPPORT_TODAY:
        return 100 * _by_party(fit, "national_support")
    regions = data["support_polling_day"].transpose(DRAW, REGION, PARTY)
    columns = pd.MultiIndex.from_product(
        [_labels(data[REGION]), _labels(data[PARTY])], names=["region", "code"]
    )
    by_region = pd.DataFrame(regions.to_numpy().reshape(data.sizes[DRAW], -1), columns=columns)
    return 100 * pd.concat([_by_party(fit, "national_support_polling_day"), by_region], axis="columns")


def judge_whole_country(election: InventedElection, fit: ReplayedFit) -> np.ndarray:
    """Whitened errors of national support on polling day, dims (zero-sum coordinate)."""
    truth = election.truth[
        (election.truth["quantity"] == Quantity.SUPPORT_POLLING_DAY) & (election.truth["region"] == COUNTRY)
    ]
    draws = _by_party(fit, "national_support_polling_day")
    return whitened_errors(
        draws[pd.MultiIndex.from_frame(truth[["region", "code"]])].to_numpy(),
        truth["truth"].to_numpy() / 100,
    )


def list_chances(election: InventedElection, fit: ReplayedFit) -> pd.DataFrame:
    """Chances of every seat and party, and who won: contest, as_of, seat, code, chance, won (0 or 1)."""
    if "seat_chance" not in fit.data:
        return pd.DataFrame(columns=["contest", "as_of", "seat", "code", "chance", "won"])
    chance = fit.data["seat_chance"].transpose(SEAT, PARTY)
    seats, codes = np.array(_labels(chance[SEAT])), np.array(_labels(chance[PARTY]))
    won = election.winners.reindex(seats).to_numpy(str)[:, None] == codes
    counted = election.inputs.counted_result
    open_seats = ~np.isin(seats, [] if counted is None else counted["seat"].to_numpy(str))
    return pd.DataFrame(
        {
            "contest": str(election.seed),
            "as_of": pd.Timestamp(election.inputs.run_date),
            "seat": np.repeat(seats[open_seats], codes.size),
            "code": np.tile(codes, int(open_seats.sum())),
            "chance": chance.to_numpy()[open_seats].ravel().astype(float),
            "won": won[open_seats].ravel().astype(float),
        }
    )


def _by_party(fit: ReplayedFit, name: str) -> pd.DataFrame:
    draws = fit.data[name].transpose(DRAW, PARTY)
    columns = pd.MultiIndex.from_product([[COUNTRY], _labels(fit.data[PARTY])], names=["region", "code"])
    return pd.DataFrame(draws.to_numpy().astype(float), columns=columns)


def _labels(coordinate: object) -> list[str]:
    return [str(label) for label in np.asarray(coordinate)]
