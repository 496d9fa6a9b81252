"""All tables of a release, from one run's draws."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import pandas as pd
import xarray as xr

from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.release.assumptions_table import build_assumptions_table
from aggregator.release.chances_table import build_chances_table
from aggregator.release.codes import contest_codes
from aggregator.release.combinations_table import build_combinations_table
from aggregator.release.deciding_seats_table import build_deciding_seats_table
from aggregator.release.houses_table import build_houses_table
from aggregator.release.mode_leans_table import build_mode_leans_table
from aggregator.release.model_checks import NO_CHECKS, ModelChecks
from aggregator.release.poll_tables import build_polls_used_table, build_polls_weighed_table
from aggregator.release.seats_tables import build_seat_chances_table, build_seats_table
from aggregator.release.seats_votes_table import build_seats_votes_table
from aggregator.release.support_table import build_support_table
from aggregator.release.table_columns import TableSchema
from aggregator.release.table_schemas import (
    ASSUMPTIONS,
    CHANCES,
    COMBINATIONS,
    DECIDING_SEATS,
    HOUSES,
    MODE_LEANS,
    POLLS_USED,
    POLLS_WEIGHED,
    PREDICTIVE,
    PRIOR_SENSITIVITY,
    SCREENS,
    SEAT_CHANCES,
    SEATS,
    SEATS_VOTES,
    SHELF_LIFE,
    SUPPORT,
)


@dataclass(frozen=True)
class ReleaseTables:
    """The tables of one release; ``docs/formats.md`` says what their columns mean.

    Attributes
    ----------
    seats, combinations
        None where nothing is counted in seats.
    seat_chances, deciding_seats
        None there too, and where lists fill all seats; the latter also where no winner of a seat adds one to
        its party.
    seats_votes
        None where no shifted counts were made.
    predictive, prior_sensitivity
        None where they were not worked out.
    """

    support: pd.DataFrame
    chances: pd.DataFrame
    houses: pd.DataFrame
    mode_leans: pd.DataFrame
    shelf_life: pd.DataFrame
    assumptions: pd.DataFrame
    polls_used: pd.DataFrame
    polls_weighed: pd.DataFrame
    screens: pd.DataFrame
    seats: pd.DataFrame | None = None
    combinations: pd.DataFrame | None = None
    seat_chances: pd.DataFrame | None = None
    deciding_seats: pd.DataFrame | None = None
    seats_votes: pd.DataFrame | None = None
    predictive: pd.DataFrame | None = None
    prior_sensitivity: pd.DataFrame | None = None

    def with_schemas(self) -> Iterator[tuple[TableSchema, pd.DataFrame]]:
        """Every table there is, with its schema."""
        pairs = (
            (SUPPORT, self.support),
            (SEATS, self.seats),
            (CHANCES, self.chances),
            (COMBINATIONS, self.combinations),
            (SEAT_CHANCES, self.seat_chances),
            (DECIDING_SEATS, self.deciding_seats),
            (SEATS_VOTES, self.seats_votes),
            (HOUSES, self.houses),
            (MODE_LEANS, self.mode_leans),
            (SHELF_LIFE, self.shelf_life),
            (ASSUMPTIONS, self.assumptions),
            (POLLS_USED, self.polls_used),
            (POLLS_WEIGHED, self.polls_weighed),
            (SCREENS, self.screens),
            (PREDICTIVE, self.predictive),
            (PRIOR_SENSITIVITY, self.prior_sensitivity),
        )
        return ((schema, table) for schema, table in pairs if table is not None)


def build_tables(
    inputs: DeskInputs,
    *,
    draws: xr.Dataset,
    seats: xr.Dataset | None,
    shelf_life: pd.DataFrame,
    polls_worth: pd.DataFrame,
    screens: pd.DataFrame,
    shifted: xr.Dataset | None = None,
    checks: ModelChecks = NO_CHECKS,
) -> ReleaseTables:
    """Summarise a run as the tables of its release.

    Parameters
    ----------
    inputs
        The desk's checked files.
    draws
        Posterior draws.
    seats
        Draws of seats; None where nothing is counted in seats.
    shelf_life
        Worth of a poll of 1,000 by age and code, as the schema ``SHELF_LIFE`` has it.
    polls_worth
        Worth today of each poll in the fit, one row per poll: ``poll``, ``worth_today``, and ``pareto_k``
        where it was worked out.
    screens
        Questions that polls raise, as the schema ``SCREENS`` has them.
    shifted
        Polling day counted again with shifted votes; None where that was not done.
    checks
        Tests of the fit beside its convergence.
    """
    contest = inputs.contest
    codes = contest_codes(contest)
    return ReleaseTables(
        support=build_support_table(draws, contest=contest, codes=codes),
        chances=build_chances_table(draws, seats=seats, contest=contest),
        houses=build_houses_table(draws),
        mode_leans=build_mode_leans_table(draws),
        shelf_life=shelf_life[list(SHELF_LIFE.column_names)],
        assumptions=build_assumptions_table(checks.alternatives, contest=contest, codes=codes),
        polls_used=build_polls_used_table(inputs.polls, polls_worth=polls_worth, contest=contest),
        polls_weighed=build_polls_weighed_table(
            inputs.polls,
            unused_polls=inputs.unused_polls,
            polls_worth=polls_worth,
            warnings=inputs.warnings,
            screens=screens,
        ),
        screens=screens,
        seats=None if seats is None else build_seats_table(seats, contest=contest, codes=codes),
        combinations=None if seats is None else build_combinations_table(seats, contest=contest),
        seat_chances=None if seats is None else build_seat_chances_table(seats),
        deciding_seats=(
            None
            if seats is None
            else build_deciding_seats_table(
                seats, contest=contest, codes=codes, counted_result=inputs.counted_result
            )
        ),
        seats_votes=(
            None if seats is None or shifted is None else build_seats_votes_table(shifted, codes=codes)
        ),
        predictive=checks.predictive,
        prior_sensitivity=checks.prior_sensitivity,
    )
