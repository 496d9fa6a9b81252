"""From a desk's checked files and draws of support to seats: all that the count needs, handed over once."""

from __future__ import annotations

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.counting_terms import CountingRule
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.seats.counting import count_prepared
from aggregator.seats.prepare import PreparedSeats, prepare_seats
from aggregator.seats.swing_forms import SwingForm
from models.dimensions import DATE


def prepare_chamber(
    inputs: DeskInputs,
    *,
    draws: xr.Dataset,
    rng: np.random.Generator,
    form: SwingForm = SwingForm.LOG_RATIO,
) -> PreparedSeats | None:
    """Prepare a contest's chamber for counting; None where nothing is counted.

    Parameters
    ----------
    inputs
        The desk's checked files.
    draws, rng, form
        As for `aggregator.seats.counting.count_seats`.
    """
    if inputs.contest.counting.rule is CountingRule.NONE or inputs.last_result is None:
        return None
    return prepare_seats(
        draws,
        last_result=inputs.last_result,
        contest=inputs.contest,
        rng=rng,
        counted_result=inputs.counted_result,
        before_last=inputs.before_last,
        transfers=inputs.transfers,
        candidates=inputs.candidates,
        form=form,
    )


def count_chamber_of(inputs: DeskInputs, prepared: PreparedSeats, *, draws: xr.Dataset) -> xr.Dataset:
    """Count a prepared chamber, its seats in the order of the last result."""
    order = [] if inputs.last_result is None else inputs.last_result["seat"].astype(str).tolist()
    return count_prepared(prepared, draws=draws, contest=inputs.contest, order=order)


def count_polling_day(
    inputs: DeskInputs,
    *,
    draws: xr.Dataset,
    rng: np.random.Generator,
    form: SwingForm = SwingForm.LOG_RATIO,
) -> xr.Dataset | None:
    """Count the seats of polling day alone; None where nothing is counted.

    Parameters
    ----------
    inputs
        The desk's checked files.
    draws
        Needs ``support_polling_day`` (chain, draw, region, party) and no dim of dates.
    rng, form
        As for `aggregator.seats.counting.count_seats`.
    """
    undated = draws["support_polling_day"].expand_dims({DATE: pd.DatetimeIndex([])})
    dated = draws.assign(support=undated)
    prepared = prepare_chamber(inputs, draws=dated, rng=rng, form=form)
    return None if prepared is None else count_chamber_of(inputs, prepared, draws=dated)
