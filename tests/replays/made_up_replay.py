"""A made-up replay: a walk of support, polls about it, honest draws about its end, and the result.

Invented numbers in plain numpy; no code of the project computes them. The draws are honest by construction:
the truth lies as far from their middle as they say.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import timedelta
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.desk_inputs import DeskInputs
from tests.made_up_draws import POLLING_DAY, made_up_contest, made_up_last_result

HOUSES = ("Plumb Line", "Saltbox Surveys", "Tally & Wick")
WEEKS = 20
SHARED_SD = 0.05  # of log support: what no poll can see
WALK_SD = 0.02  # of log support, per root of a week


@dataclass(frozen=True)
class MadeUpFit:
    """A record as whoever runs fits would hand it over."""

    key: str
    data: xr.Dataset
    facts: dict[str, object]


@dataclass(frozen=True)
class MadeUpReplay:
    """One contest, its fits and its outcome."""

    records: list[MadeUpFit]
    inputs: DeskInputs
    outcome: pd.DataFrame


def made_up_replay(
    folder: Path,
    *,
    seed: int = 1,
    dates: int = 8,
    draws: int = 200,
    title: str | None = None,
    too_sure: float = 1.0,
) -> MadeUpReplay:
    """Simulate one contest; ``too_sure`` divides the spread of the draws, so that they are not honest."""
    rng = np.random.default_rng(seed)
    contest = made_up_contest()
    if title is not None:
        contest = contest.model_copy(update={"title": title})
    last = made_up_last_result()
    parties = list(contest.party_codes)
    votes = last[parties].to_numpy(float)
    start = np.where(votes > 0, votes, 0.02 * votes.sum(axis=1, keepdims=True))
    start[:, parties.index("HED")][last["region"] == "SKERRY"] = 0.0
    regions = [np.flatnonzero(last["region"] == region) for region in contest.region_codes]
    walk = np.cumsum(rng.normal(0, WALK_SD, (WEEKS + 1, len(parties))), axis=0)
    local = rng.normal(0, 0.15, start.shape)
    shared = rng.normal(0, SHARED_SD, len(parties))

    def seats_shares(swing: np.ndarray) -> np.ndarray:
        shares = start * np.exp(local + swing[..., None, :])
        return shares / shares.sum(axis=-1, keepdims=True)

    true = np.round(seats_shares(walk[-1] + shared) * 10_000)
    outcome = last.assign(**{party: true[:, place] for place, party in enumerate(parties)})
    polls = _polls(rng, seats_shares(walk).mean(axis=-2), parties, contest.region_codes, contest.column_codes)
    records = []
    for number in range(dates):
        week = WEEKS - dates + number
        left = WEEKS - week
        sd = np.sqrt(SHARED_SD**2 + left * WALK_SD**2)
        middle = walk[week] + rng.normal(0, 0.001, len(parties))
        swing = middle + rng.normal(0, sd / too_sure, (draws, len(parties)))
        shares = seats_shares(swing)
        regional = np.stack([shares[:, rows].mean(axis=1) for rows in regions], axis=1)
        won = shares.argmax(axis=-1)
        chance = np.stack([(won == place).mean(axis=0) for place in range(len(parties))], axis=1)
        seats = np.stack([(won == place).sum(axis=1) for place in range(len(parties))], axis=1)
        day = POLLING_DAY - timedelta(weeks=left)
        age = np.arange(91)
        error = 2.5 + 0.02 * (age[:, None] + 7 * left) + np.zeros(len(parties))
        data = xr.Dataset(
            {
                "national_support": (("draw", "party"), shares.mean(axis=1)),
                "national_support_polling_day": (("draw", "party"), shares.mean(axis=1)),
                "support_polling_day": (("draw", "region", "party"), regional),
                "seats_polling_day": (("draw", "party"), seats.astype(np.int16)),
                "seat_chance": (("seat", "party"), chance),
                "expected_error": (("age", "code"), error),
            },
            coords={
                "party": parties,
                "code": parties,
                "region": list(contest.region_codes),
                "seat": last["seat"].tolist(),
                "seat_region": ("seat", last["region"].tolist()),
                "age": age,
            },
        )
        facts = {
            "as_of": day.isoformat(),
            "polling_day": POLLING_DAY.isoformat(),
            "seed": 1,
            "passed": True,
            "verdict": "All checks of the fit passed.",
            "divergences": 0,
            "worst_rhat": 1.004,
            "least_tail_ess": 900.0,
            "polls_used": int((polls["published"] <= pd.Timestamp(day)).sum()),
            "last_fieldwork": polls.loc[polls["published"] <= pd.Timestamp(day), "end"]
            .max()
            .date()
            .isoformat(),
            "seconds": 12.5,
            "version": "0.1.0",
        }
        records.append(MadeUpFit(f"saltmarsh-{day}-ab12", data, facts))
    folder.mkdir(parents=True, exist_ok=True)
    inputs = DeskInputs(
        folder=folder,
        contest=contest,
        run_date=POLLING_DAY,
        polls=polls,
        unused_polls=pd.DataFrame(),
        last_result=last,
        warnings=(),
        unpublished=(),
        files=(),
    )
    return MadeUpReplay(records, inputs, outcome)


def with_outcome(replay: MadeUpReplay, outcome: pd.DataFrame) -> MadeUpReplay:
    """The same replay, with another result."""
    return replace(replay, outcome=outcome)


def _polls(
    rng: np.random.Generator,
    support: np.ndarray,
    parties: list[str],
    regions: tuple[str, ...],
    codes: tuple[str, ...],
) -> pd.DataFrame:
    """Two polls a week, the second of which asks for the alliance as one and leaves the newcomer to "
    "others."""
    rows = []
    lean = rng.normal(0, 0.03, (len(HOUSES), len(parties)))
    for week in range(WEEKS):
        for second in (False, True):
            house = int(rng.integers(len(HOUSES)))
            shares = support[week] * np.exp(lean[house])
            counts = rng.multinomial(1000, shares / shares.sum())
            percent = dict(zip(parties, 100 * counts / counts.sum(), strict=True))
            end = pd.Timestamp(POLLING_DAY) - pd.Timedelta(weeks=WEEKS - week, days=2 + second)
            figures = dict.fromkeys(codes, np.nan) | percent | {"remainder": np.nan}
            if second:
                figures |= {"GLOW": percent["LAN"] + percent["HED"], "LAN": np.nan, "HED": np.nan}
                figures |= {"remainder": percent["TID"] + percent["OTH"], "TID": np.nan, "OTH": np.nan}
            rows.append(
                {
                    "row": len(rows) + 2,
                    "poll": f"P{len(rows) + 1:03d}",
                    "house": HOUSES[house],
                    "sponsor": "",
                    "start": end - pd.Timedelta(days=2),
                    "end": end,
                    "published": end + pd.Timedelta(days=1),
                    "regions": regions,
                    "sample": 1000,
                    "respondents": 1000.0,
                    "poll_respondents": 1000.0,
                    "effective": np.nan,
                    "mode": "",
                    "population": "",
                    "method": "",
                    "undecided": np.nan,
                    "source": "",
                    "note": "",
                    **figures,
                }
            )
    return pd.DataFrame(rows)
