"""How wrong polls and estimates were, by the days they had still to go: measured, beside the formula."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.release.table_words import Level
from aggregator.replays.methods import Method, Quantity
from aggregator.replays.result_shares import COUNTRY, ScoredCodes

ALL_PARTIES = ""
"""Code of the rows for all parties together."""
STALENESS_COLUMNS = [
    "days_from", "days_to", "code", "level", "contests", "polls", "poll_error", "sample", "expected_error",
    "estimates", "estimate_error", "estimate_expected",
]  # fmt: skip
_KEYS = ["band", "code"]
_POLL_ERRORS = ["contest", "poll", "code", "level", "days_before", "sample", "error"]


@dataclass(frozen=True)
class Age:
    """A band of days before polling day, both ends included."""

    first: int
    last: int


AGES = tuple(
    Age(first, last)
    for first, last in (
        (0, 6), (7, 13), (14, 20), (21, 27), (28, 41), (42, 55), (56, 69), (70, 90), (91, 120), (121, 150),
        (151, 180), (181, 240), (241, 300), (301, 365), (366, 547), (548, 730),
    )
)  # fmt: skip
"""Weeks at first, then ever wider, as polls grow rarer and change with age less."""


def single_poll_errors(inputs: DeskInputs, *, truth: pd.Series, codes: ScoredCodes) -> pd.DataFrame:
    """Error of every national figure that a poll gave for a code on its own, in points.

    Parameters
    ----------
    inputs
        Its polls, as they stand now.
    truth
        Result in the country, 0–1, index codes, alliances among them.
    codes
        The codes to look at. Figures read from a lump are not a poll's own, and are left out.
    """
    polls = inputs.polls
    everywhere = set(inputs.contest.region_codes)
    national = polls[[set(regions) == everywhere for regions in polls["regions"]]]
    middle = national["start"].fillna(national["end"])
    middle = middle + (national["end"] - middle) / 2
    days = (pd.Timestamp(inputs.contest.last_polling_day) - middle).dt.total_seconds() / 86_400
    tables = []
    for code in (str(code) for code in codes.sums.index if code in national.columns):
        tables.append(
            pd.DataFrame(
                {
                    "contest": inputs.contest.title,
                    "poll": national["poll"],
                    "code": code,
                    "level": codes.levels[code],
                    "days_before": days.astype(float),
                    "sample": national["respondents"].astype(float),
                    "error": national[code].astype(float) - 100.0 * float(truth[code]),
                }
            )
        )
    return pd.concat(tables, ignore_index=True)[_POLL_ERRORS].dropna(subset=["error"]).reset_index(drop=True)


def measure_staleness(
    scores: pd.DataFrame, *, poll_errors: pd.DataFrame, expected_errors: pd.DataFrame
) -> pd.DataFrame:
    """Tabulate root mean square errors by days before polling day.

    Three things stand side by side: single polls, what the shelf-life formula expects of a poll of 1,000
    that is so old on polling day, and the estimate for polling day made that many days before it (with its
    own standard deviation). Each contest counts once in a row, whatever its number of polls.

    Parameters
    ----------
    scores
        As ``ReplayScores.scores``.
    poll_errors
        From ``single_poll_errors``.
    expected_errors
        ``contest, days_before, code, expected_error``: what the fits said of a poll at that distance.

    Returns
    -------
    pandas.DataFrame
        One row per band of days and code, and one for all parties together (code blank; others and
        alliances left out). NaN where there was nothing to measure.
    """
    ours = scores[
        (scores["method"] == Method.FIELDFOLD)
        & (scores["quantity"] == Quantity.SUPPORT)
        & (scores["region"] == COUNTRY)
    ]
    # The width of the 90 % interval gives back the sd that the estimate claims (exact for a normal one).
    ours = ours.assign(claimed=ours["width_90"] / (2 * 1.6448536269514722))
    levels = ours.drop_duplicates("code").set_index("code")["level"]
    parties = set(levels.index[levels == Level.PARTY])
    polls = _banded(poll_errors, "error", parties)
    estimates = _banded(ours, "error", parties)
    claims = _banded(ours, "claimed", parties)
    formula = _banded(expected_errors, "expected_error", parties)
    table = pd.DataFrame(
        {
            "polls": polls.groupby(_KEYS)["poll"].nunique(),
            "poll_error": _rms(polls),
            "sample": polls.groupby(_KEYS)["sample"].median(),
            "estimates": estimates.drop_duplicates([*_KEYS, "contest", "as_of"]).groupby(_KEYS).size(),
            "estimate_error": _rms(estimates),
            "estimate_expected": _rms(claims),
            "contests": pd.concat([polls, estimates]).groupby(_KEYS)["contest"].nunique(),
        }
    )
    table["expected_error"] = _rms(formula).reindex(table.index)
    table = table.fillna({"polls": 0, "estimates": 0}).reset_index()
    order = {ALL_PARTIES: -1} | {str(code): place for place, code in enumerate(levels.index)}
    table = table.assign(
        days_from=[AGES[band].first for band in table["band"]],
        days_to=[AGES[band].last for band in table["band"]],
        level=table["code"].map({ALL_PARTIES: str(Level.PARTY)} | levels.to_dict()),
        place=table["code"].map(order),
    )
    # A code that polls ask for and nobody estimates has no place beside an estimate.
    table = table[table["place"].notna()]
    return table.sort_values(["band", "place"], ignore_index=True)[STALENESS_COLUMNS]


def _banded(errors: pd.DataFrame, name: str, parties: set[str]) -> pd.DataFrame:
    """Squares of a column with the band of days each lies in; rows of parties again under one code."""
    band = (
        np.searchsorted([age.first for age in AGES], errors["days_before"].to_numpy(float), side="right") - 1
    )
    rows = errors.assign(band=band, square=errors[name].astype(float) ** 2)
    rows = rows[(band >= 0) & (errors["days_before"] < AGES[-1].last + 1)]
    together = rows[rows["code"].isin(parties)].assign(code=ALL_PARTIES)
    return pd.concat([rows, together], ignore_index=True)


def _rms(rows: pd.DataFrame) -> pd.Series:
    """Root mean square by band and code, each contest counted once."""
    by_contest = rows.groupby([*_KEYS, "contest"])["square"].mean()
    return np.sqrt(by_contest.groupby(level=_KEYS).mean())
