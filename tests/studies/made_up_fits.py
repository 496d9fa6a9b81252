"""Records of fits that were never made: draws about an invented election's truth, of a known spread."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.studies.invented_elections import InventedElection, Quantity
from models.dimensions import DRAW, PARTY, REGION, SEAT

PARTIES, REGIONS, SEATS = ("P1", "P2", "OTH"), ("R1", "R2"), ("R1-01", "R1-02", "R2-01")


@dataclass(frozen=True)
class MadeUpFit:
    """What a study reads of a fit."""

    data: xr.Dataset
    key: str = "made-up"
    facts: Mapping[str, Any] = field(
        default_factory=lambda: {
            "as_of": "2030-05-20",
            "passed": True,
            "divergences": 0,
            "stands_out": [],
            "seconds": {"build": 1.0, "sampling": 2.0, "all": 4.0},
            "reused_compilation": False,
        }
    )


def made_up_fit(
    centres: pd.DataFrame, *, sd: float, rng: np.random.Generator, draws: int = 800, won: float = 0.5
) -> MadeUpFit:
    """Draws of log shares with one sd about given shares (rows: country "", R1, R2; columns parties)."""

    def shares(region: str) -> np.ndarray:
        log = np.log(centres.loc[region].to_numpy()) + sd * rng.normal(size=(draws, len(PARTIES)))
        return np.exp(log) / np.exp(log).sum(axis=1, keepdims=True)

    seats = rng.multinomial(len(SEATS), centres.loc[""].to_numpy(), size=draws)
    chance = np.full((len(SEATS), len(PARTIES)), (1 - won) / 2)
    chance[:, 0] = won
    data = xr.Dataset(
        {
            "national_support": ((DRAW, PARTY), shares("")),
            "national_support_polling_day": ((DRAW, PARTY), shares("")),
            "support_polling_day": ((DRAW, REGION, PARTY), np.stack([shares(r) for r in REGIONS], axis=1)),
            "seats_polling_day": ((DRAW, PARTY), seats),
            "seat_chance": ((SEAT, PARTY), chance),
        },
        coords={PARTY: list(PARTIES), REGION: list(REGIONS), SEAT: list(SEATS)},
    )
    return MadeUpFit(data)


def made_up_truth(shares: pd.DataFrame, *, seats: tuple[int, ...]) -> pd.DataFrame:
    """Truth of an election in the form of a study: given shares (0–1) on polling day and today, and seats."""
    rows = [
        (Quantity.SUPPORT_POLLING_DAY, region, code, 100 * shares.loc[region, code])
        for region in shares.index
        for code in PARTIES
    ]
    rows += [(Quantity.SUPPORT_TODAY, "", code, 100 * shares.loc["", code]) for code in PARTIES]
    rows += [(Quantity.SEATS, "", code, float(count)) for code, count in zip(PARTIES, seats, strict=True)]
    return pd.DataFrame(rows, columns=["quantity", "region", "code", "truth"])


def made_up_pair(
    seed: int, *, inputs: Any, stated: float = 0.1, true: float = 0.1
) -> tuple[InventedElection, MadeUpFit]:
    """An election and a fit whose stated sd of log shares may differ from the true one."""
    rng = np.random.default_rng(seed)
    centres = pd.DataFrame([(0.5, 0.3, 0.2), (0.4, 0.4, 0.2), (0.6, 0.2, 0.2)], ["", *REGIONS], list(PARTIES))
    log = np.log(centres) + true * rng.normal(size=centres.shape)
    truth = np.exp(log).div(np.exp(log).sum(axis=1), axis=0)
    seats = tuple(rng.multinomial(len(SEATS), centres.loc[""].to_numpy()).tolist())
    election = InventedElection(
        seed=seed,
        inputs=inputs,
        truth=made_up_truth(truth, seats=seats),
        winners=pd.Series(rng.choice(["P1", "P2"], size=len(SEATS)), index=list(SEATS), name="code"),
        silent_days=7,
    )
    return election, made_up_fit(centres, sd=stated, rng=rng)
