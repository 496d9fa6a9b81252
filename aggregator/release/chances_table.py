"""Chances of leading, of a majority alone, of one only as an alliance, and of none."""

from __future__ import annotations

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.release.chamber import sizes_in_draws
from aggregator.release.likelihood_words import likelihood_word
from aggregator.release.rounding import SMALLEST_CHANCE, round_chance
from aggregator.release.statements import days_and_kinds, values_by_day
from aggregator.release.table_schemas import CHANCES
from aggregator.seats.majorities import (
    FloatArray,
    Outcome,
    leads_in_draws,
    majorities_in_draws,
    majority_line,
    monte_carlo_error,
)


def build_chances_table(draws: xr.Dataset, *, seats: xr.Dataset | None, contest: Contest) -> pd.DataFrame:
    """Chances on every date and on polling day.

    Parameters
    ----------
    draws
        Posterior draws with ``national_support`` and ``national_support_polling_day``.
    seats
        Draws of seats; None where nothing is counted in seats, and then only ``most_support`` has rows.
    contest
        Gives the order of the parties, polling day, the majority line and the alliances' dates.

    Returns
    -------
    pandas.DataFrame
        Columns of the schema ``CHANCES``.
    """
    support = values_by_day(draws, "national_support", contest=contest)
    won = None if seats is None else values_by_day(seats, "seats", contest=contest)
    labels: list[dict[str, object]] = []
    chances: list[FloatArray] = []
    for place, (day, kind) in enumerate(days_and_kinds(draws, contest=contest)):
        outcomes = leads_in_draws(support[place], outcome=Outcome.MOST_SUPPORT)
        if won is not None:
            active = [alliance for alliance in contest.alliances if alliance.active_on(day)]
            line = majority_line(contest, chamber=sizes_in_draws(won[place]))
            outcomes += leads_in_draws(won[place], outcome=Outcome.LARGEST)
            outcomes += majorities_in_draws(won[place], alliances=active, majority=line)
        for outcome, code, happens in outcomes:
            labels.append(
                {"date": np.datetime64(day, "s"), "kind": kind.value, "outcome": outcome.value, "code": code}
            )
            chances.append(happens)
    happened = np.stack(chances, axis=-1)
    samples = happened.shape[0] * happened.shape[1]
    table = pd.DataFrame(labels)
    table["probability"] = round_chance(happened.mean(axis=(0, 1)), samples=samples)
    table["mc_error"] = np.maximum(monte_carlo_error(happened), SMALLEST_CHANCE)
    table["likelihood"] = table["probability"].map(likelihood_word)
    return table[list(CHANCES.column_names)]
