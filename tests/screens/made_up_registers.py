"""Registers to screen: honest ones, the tidiest honest ones, and ones whose figures were pulled together."""

from __future__ import annotations

import tempfile
from datetime import date
from pathlib import Path

import numpy as np
import pandas as pd

from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from data_demo.made_up_election import ElectionSize, simulate_election
from data_demo.made_up_folder import write_contest_folder

REGIONS = ("NORTH", "SOUTH")
SHARES = {"AA": 0.34, "BB": 0.27, "CC": 0.16, "DD": 0.11, "EE": 0.07, "OTH": 0.05}
CODES = tuple(SHARES)
AFTER_THE_ELECTION = date(2100, 1, 1)
RECENT_DAYS = 21


def simulated_inputs(seed: int, *, size: ElectionSize | None = None) -> DeskInputs:
    """An honest made-up election, read from its files: drift, house effects, design effects, special rows."""
    with tempfile.TemporaryDirectory() as folder:
        write_contest_folder(simulate_election(seed, size=size), Path(folder))
        return read_contest_folder(Path(folder), today=AFTER_THE_ELECTION)


def tidy_register(
    seed: int,
    *,
    houses: int = 8,
    polls: int = 200,
    days: int = 500,
    steps: tuple[float, ...] = (0.1, 0.5, 1.0),
) -> pd.DataFrame:
    """Simple random samples of opinion that never moves, no leans: honest, and as alike as honest polls get.

    Columns as in ``DeskInputs.polls`` as far as screens read them.
    """
    rng = np.random.default_rng(seed)
    usual = rng.integers(700, 2000, houses)
    free = rng.permuted(np.tile(np.arange(0, days, 5), (houses, 1)), axis=1)
    rows = []
    for number in range(polls):
        house, place = number % houses, number // houses
        start = int(free[house, place])
        length = int(rng.integers(1, 5))
        size = int(usual[house] * np.exp(0.12 * rng.normal()))
        step = steps[house % len(steps)]
        share = 100 * rng.multinomial(size, list(SHARES.values())) / size
        printed = np.round(share / step) * step
        # As the register is read: what rounding left over is shared out.
        scale = 100 / printed.sum()
        day = pd.Timestamp("2031-01-01") + pd.Timedelta(days=start)
        end = day + pd.Timedelta(days=length - 1)
        rows.append(
            {
                "row": number + 2,
                "poll": f"P{number:03d}",
                "house": f"House {house}",
                "mode": "telephone",
                "start": day,
                "end": end,
                "published": end + pd.Timedelta(days=int(rng.integers(1, 5))),
                "regions": REGIONS,
                "sample": float(size),
                "respondents": float(size),
                "rounding_step": step * scale,
                "remainder": np.nan,
                **dict(zip(CODES, printed * scale, strict=True)),
            }
        )
    return pd.DataFrame(rows)


def pulled_together(
    polls: pd.DataFrame, *, houses: set[str], codes: tuple[str, ...], pull: float = 0.5
) -> pd.DataFrame:
    """Move figures of some houses part of the way to the mean of the field's last three weeks; print anew."""
    herded = polls.sort_values(["end", "row"]).copy()
    end, house = herded["end"].to_numpy(), herded["house"].to_numpy(str)
    where = herded["regions"].map(frozenset).to_numpy()
    figures, step = herded[list(codes)].to_numpy(float, copy=True), herded["rounding_step"].to_numpy(float)
    for place in range(len(herded)):
        since = end[place] - np.timedelta64(RECENT_DAYS, "D")
        recent = (end[:place] >= since) & np.array(
            [asked == where[place] for asked in where[:place]], dtype=bool
        )
        if house[place] not in houses or recent.sum() < 3:
            continue
        for column in range(len(codes)):
            seen = figures[:place, column][recent]
            if np.isfinite(seen).any() and np.isfinite(figures[place, column]):
                moved = figures[place, column] + pull * (np.nanmean(seen) - figures[place, column])
                figures[place, column] = np.round(moved / step[place]) * step[place]
    herded[list(codes)] = figures
    return herded.sort_index()
