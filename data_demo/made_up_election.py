"""A whole election from one seed: last result, support, houses, polls, outcome, and the truth behind it.

The simulation shares no code with the programs that estimate from it, so that agreement between the
two means something.

Examples
--------
>>> from data_demo.made_up_election import SMALL_ELECTION, simulate_election
>>> election = simulate_election(1, size=SMALL_ELECTION)
>>> int(election.truth.seats["seats"].sum())
30
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from data_demo.made_up_country import draw_country
from data_demo.made_up_leans import draw_house_truth
from data_demo.made_up_polls import draw_polls
from data_demo.made_up_record import draw_past_errors
from data_demo.made_up_result import draw_polling_day
from data_demo.made_up_scenery import Scenery
from data_demo.made_up_schedule import draw_schedule
from data_demo.made_up_size import SMALL_ELECTION, UNTIDY_ELECTION, ElectionSize, draw_scenery
from data_demo.made_up_truth import Truth, tell_truth
from data_demo.made_up_violation import Violation

__all__ = [
    "SMALL_ELECTION",
    "UNTIDY_ELECTION",
    "ElectionSize",
    "MadeUpElection",
    "Truth",
    "simulate_election",
    "simulate_scenery",
]


@dataclass(frozen=True)
class MadeUpElection:
    """An invented election: the files a desk would have, the outcome, and the truth.

    Attributes
    ----------
    scenery
        Calendar, parties, alliances, regions, houses.
    polls
        As in ``polls.csv``: shares in percent, NaN where not offered, dates as ISO text.
    result_last, outcome
        Votes by seat, as in ``result_last.csv`` and ``result_outcome.csv``.
    counted
        The outcome of the regions that are counted before polling day, as in ``result_counted.csv``.
    before_last
        Votes by seat of the election before the last one, as in ``result_before_last.csv``; no row where
        nobody has them.
    past_errors
        As in ``past_errors.csv``: election, code, polled, result (percent); no row without a record.
    """

    seed: int
    scenery: Scenery
    polls: pd.DataFrame
    result_last: pd.DataFrame
    outcome: pd.DataFrame
    counted: pd.DataFrame
    before_last: pd.DataFrame
    past_errors: pd.DataFrame
    truth: Truth


def simulate_election(
    seed: int,
    *,
    size: ElectionSize | None = None,
    shared_lean: bool = True,
    violation: Violation | None = None,
) -> MadeUpElection:
    """Simulate a nameless election; everything is drawn anew from the seed.

    Parameters
    ----------
    size
        How large it is; by default seven parties, eight regions, 200 seats and 250 polls.
    shared_lean
        Whether all houses share a lean (regional leans included). House effects are drawn either way.
    violation
        What goes wrong beside that; see ``all_violations``.

    Raises
    ------
    ValueError
        Where a size cannot be built, or has more polls than its houses' calendars have room for.
    """
    scenery = draw_scenery(size or ElectionSize(), rng=np.random.default_rng([seed, 0]))
    return simulate_scenery(scenery, seed=seed, shared_lean=shared_lean, violation=violation)


def simulate_scenery(
    scenery: Scenery, *, seed: int, shared_lean: bool = True, violation: Violation | None = None
) -> MadeUpElection:
    """Simulate an election whose calendar, parties, regions and houses are given."""
    # One stream per subject: another register leaves the country and its result as they were.
    country_rng, house_rng, poll_rng, result_rng, record_rng, violation_rng = (
        np.random.default_rng([seed, k]) for k in range(1, 7)
    )
    change = violation or Violation()
    scenery = change.change_scenery(scenery)
    country = draw_country(scenery, shared_lean=shared_lean, rng=country_rng)
    country = change.change_country(country, rng=violation_rng)
    schedule = draw_schedule(country, rng=poll_rng)
    houses = change.change_houses(draw_house_truth(country, schedule=schedule, rng=house_rng))
    register = draw_polls(country, houses=houses, schedule=schedule, rng=poll_rng)
    register = change.change_register(register, country=country, rng=violation_rng)
    result = draw_polling_day(country, rng=result_rng)
    early = [r.code for r in scenery.regions if r.counted is not None]
    return MadeUpElection(
        seed=seed,
        scenery=scenery,
        polls=register.polls,
        result_last=country.last_votes,
        outcome=result.votes,
        counted=result.votes[result.votes["region"].isin(early)].reset_index(drop=True),
        before_last=country.last_votes.iloc[:0] if country.before_last is None else country.before_last,
        past_errors=draw_past_errors(country, shared_lean=shared_lean, rng=record_rng),
        truth=tell_truth(country, houses=houses, register=register, result=result),
    )
