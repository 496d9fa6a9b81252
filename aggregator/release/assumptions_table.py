"""What the headline numbers would be had the run assumed something else."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd

from aggregator.alternatives import Alternative
from aggregator.inputs.contest import Contest
from aggregator.release.chamber import sizes_in_draws
from aggregator.release.check_schemas import ASSUMPTIONS
from aggregator.release.codes import Code
from aggregator.release.draw_summaries import stack_samples, summarise_samples
from aggregator.release.rounding import round_chance
from aggregator.release.table_words import Level
from aggregator.seats.majorities import (
    FloatArray,
    Outcome,
    leads_in_draws,
    majorities_in_draws,
    majority_line,
)
from models.dimensions import PARTY

PERCENT = 100.0
NUMBERS = ("mean", "q05", "q95", "seats_mean", "seats_q05", "seats_q95", "largest", "majority_alone")


def build_assumptions_table(
    alternatives: Sequence[Alternative], *, contest: Contest, codes: Sequence[Code]
) -> pd.DataFrame:
    """Summarise polling day under every setting, one row per setting and code.

    Parameters
    ----------
    alternatives
        Settings with the draws that follow from them; one without draws has rows without numbers.
    contest
        Gives the majority line and the alliances of polling day.
    codes
        The codes to summarise, in the order of the rows.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``ASSUMPTIONS``, shares in percent.
    """
    voting = [code for code in codes if code.exists_on(contest.last_polling_day)]
    rows = [row for each in alternatives for row in _rows(each, contest=contest, codes=voting)]
    table = pd.DataFrame(rows, columns=list(ASSUMPTIONS.column_names))
    return table.astype(dict.fromkeys(NUMBERS, float))


def _rows(alternative: Alternative, *, contest: Contest, codes: Sequence[Code]) -> list[dict[str, object]]:
    numbers: dict[str, dict[str, FloatArray]] = {code.code: {} for code in codes}
    if alternative.draws is not None:
        share = alternative.draws["national_support_polling_day"]
        samples = PERCENT * np.stack(
            [stack_samples(share.sel({PARTY: list(code.members)}).sum(PARTY), dims=()) for code in codes]
        )
        _add_summary(numbers, codes, summarise_samples(samples), prefix="")
    if alternative.seats is not None:
        won = alternative.seats["seats_polling_day"]
        samples = np.stack(
            [stack_samples(won.sel({PARTY: list(code.members)}).sum(PARTY), dims=()) for code in codes]
        )
        _add_summary(numbers, codes, summarise_samples(samples, whole=True), prefix="seats_")
        _add_chances(numbers, alternative, contest)
    return [
        {
            "assumption": alternative.assumption,
            "setting": alternative.setting,
            "in_use": "yes" if alternative.in_use else "no",
            "code": code.code,
            "level": code.level.value,
            **numbers[code.code],
        }
        for code in codes
    ]


def _add_summary(
    numbers: dict[str, dict[str, FloatArray]],
    codes: Sequence[Code],
    summary: dict[str, FloatArray],
    *,
    prefix: str,
) -> None:
    for place, code in enumerate(codes):
        numbers[code.code] |= {f"{prefix}{name}": summary[name][place] for name in ("mean", "q05", "q95")}


def _add_chances(
    numbers: dict[str, dict[str, FloatArray]], alternative: Alternative, contest: Contest
) -> None:
    if alternative.seats is None:
        return
    won = alternative.seats["seats_polling_day"].sel({PARTY: list(contest.party_codes)})
    line = majority_line(contest, chamber=sizes_in_draws(won))
    outcomes = [
        *leads_in_draws(won, outcome=Outcome.LARGEST),
        *majorities_in_draws(won, alliances=(), majority=line),
    ]
    for outcome, code, happens in outcomes:
        if outcome in (Outcome.LARGEST, Outcome.MAJORITY_ALONE):
            numbers[code][outcome.value] = round_chance(happens.mean(), samples=happens.size)


def parties_that_matter(table: pd.DataFrame, *, most: int) -> list[str]:
    """Name the parties with most support under the settings in use, largest first."""
    used = table[(table["in_use"] == "yes") & (table["level"] == Level.PARTY)]
    mean = used.groupby("code", sort=False)["mean"].mean().sort_values(ascending=False, kind="stable")
    return [str(code) for code in mean.index[:most]]
