"""How seats follow votes: curves, seats per point, and the lead at equal votes."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.release.codes import Code
from aggregator.release.draw_summaries import summarise_samples
from aggregator.release.table_schemas import SEATS_VOTES
from aggregator.release.table_words import SeatsVotes
from aggregator.seats.seats_votes import (
    SHIFT,
    FloatArray,
    lead_at_equal_votes,
    responsiveness,
    seats_at_votes,
    votes_as_they_are,
)

PERCENT = 100.0
QUANTILES = ("mean", "sd", "q05", "q25", "q50", "q75", "q95")


def build_seats_votes_table(shifted: xr.Dataset, *, codes: Sequence[Code]) -> pd.DataFrame:
    """Summarise how the seats of each code follow its votes on polling day.

    Parameters
    ----------
    shifted
        As `aggregator.seats.seats_votes.count_votes_to_seats` returns it: ``seats`` and ``votes`` (draw,
        shift, party), coordinates ``code``, ``against`` and ``log_factor``.
    codes
        The codes there are, in the order of the rows.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``SEATS_VOTES``.
    """
    by_code = {code.code: code for code in codes}
    pairs = list(dict.fromkeys(zip(shifted["code"].values, shifted["against"].values, strict=True)))
    curves = {str(code) for code, against in pairs if not against}
    tables = [_curve(_part(shifted, code.code), code) for code in codes if code.code in curves]
    tables += [
        _lead(_part(shifted, str(code), str(rival)), by_code[str(code)], by_code[str(rival)])
        for code, rival in pairs
        if rival
    ]
    return pd.concat(tables, ignore_index=True)[list(SEATS_VOTES.column_names)]


def _part(shifted: xr.Dataset, code: str, rival: str = "") -> xr.Dataset:
    chosen = (shifted["code"] == code) & (shifted["against"] == rival)
    return shifted.isel({SHIFT: np.flatnonzero(chosen.to_numpy())})


def _curve(shifted: xr.Dataset, code: Code) -> pd.DataFrame:
    """Seats at each vote, then seats per point about the vote that the code has."""
    curve = seats_at_votes(shifted, members=code.members)
    slope = responsiveness(shifted, members=code.members)
    here = votes_as_they_are(shifted, members=code.members).mean()
    return pd.concat(
        [
            _rows(code, SeatsVotes.CURVE, votes=curve["votes"].to_numpy(), samples=curve.to_numpy()),
            _rows(code, SeatsVotes.RESPONSIVENESS, votes=np.array([here]), samples=slope[None]),
        ]
    )


def _lead(shifted: xr.Dataset, code: Code, rival: Code) -> pd.DataFrame:
    lead, vote = lead_at_equal_votes(shifted, members=code.members, rivals=rival.members)
    rows = _rows(code, SeatsVotes.LEAD_AT_EQUAL_VOTES, votes=np.array([vote.mean()]), samples=lead[None])
    return rows.assign(against=rival.code)


def _rows(code: Code, what: SeatsVotes, *, votes: FloatArray, samples: FloatArray) -> pd.DataFrame:
    """One row per vote; ``samples`` has shape (vote, draw)."""
    summary = summarise_samples(samples)
    return pd.DataFrame(
        {
            "code": code.code,
            "level": code.level.value,
            "what": what.value,
            "against": "",
            "votes": PERCENT * votes,
            **{name: summary[name] for name in QUANTILES},
        }
    )
