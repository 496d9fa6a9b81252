"""An invented election as a desk would meet it, and the truth to hold its estimates against.

Everything is drawn anew from the seed: how fast opinion moves, houses, the lean they share, regions, seats,
rounding, lumping, and how long before polling day the polls fall silent. The election takes the whole way: it
is written as a contest folder and read like a desk's. The simulator (``data_demo``) shares no code with the
model.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import timedelta
from enum import StrEnum
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np
import pandas as pd

from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from data_demo.made_up_election import ElectionSize, MadeUpElection, simulate_election
from data_demo.made_up_folder import write_contest_folder
from data_demo.made_up_violation import Violation

SHORTEST_SILENCE, LONGEST_SILENCE = 2, 28
"""Days from the last publication to polling day: from hardly any to the longer bans on publishing."""
DRIFT_LOG_SD = 0.42
"""Countries differ in how fast opinion moves: nine in ten between half and twice the usual speed."""
# A stream of random numbers beside the simulator's own, which are 0 to 6.
HABITS_STREAM = 10
COUNTRY = ""


class Quantity(StrEnum):
    """What is held against the truth: shares in percent, seats as numbers."""

    SUPPORT_POLLING_DAY = "support_polling_day"
    SUPPORT_TODAY = "support_today"
    SEATS = "seats"


@dataclass(frozen=True)
class InventedElection:
    """One election of a study.

    Attributes
    ----------
    seed
        Makes it again.
    inputs
        What a desk knows on the day the last poll may be published.
    truth
        Columns ``quantity``, ``region`` (blank: the country), ``code``, ``truth``: percent, or seats. Only
        what can be wrong: no party where it does not stand, no region that was counted before.
    winners
        Who won each seat: code by seat.
    silent_days
        Days from the last publication to polling day.
    """

    seed: int
    inputs: DeskInputs
    truth: pd.DataFrame
    winners: pd.Series
    silent_days: int


def draw_invented_election(
    seed: int, *, size: ElectionSize, violation: Violation | None = None
) -> InventedElection:
    """Draw an election, write it as a desk would, and read it.

    Parameters
    ----------
    size
        How large and how untidy it is.
    violation
        What goes wrong in it that the model knows nothing of.

    Raises
    ------
    ValueError
        Where the size leaves no room for its polls.
    """
    drawn = draw_habits(size, rng=np.random.default_rng([seed, HABITS_STREAM]))
    election = simulate_election(seed, size=drawn, violation=violation)
    inputs = _as_a_desk_reads(election)
    outcome = election.outcome.set_index("seat")[list(election.scenery.codes)]
    return InventedElection(
        seed=seed,
        inputs=inputs,
        truth=_truth(election, counted=_counted_regions(inputs)),
        winners=outcome.idxmax(axis=1).rename("code"),
        silent_days=drawn.silent_days,
    )


def draw_habits(size: ElectionSize, *, rng: np.random.Generator) -> ElectionSize:
    """Draw how long the polls are silent before polling day, and how fast opinion moves."""
    silent_days = int(rng.integers(SHORTEST_SILENCE, LONGEST_SILENCE + 1))
    return replace(
        size, silent_days=silent_days, drift=size.drift * float(np.exp(DRIFT_LOG_SD * rng.normal()))
    )


def _as_a_desk_reads(election: MadeUpElection) -> DeskInputs:
    """Read the election's folder as of the day the register ends."""
    day = election.scenery.register_end
    with TemporaryDirectory(prefix="fieldfold-") as place:
        write_contest_folder(election, Path(place))
        return read_contest_folder(
            Path(place), as_of=day, today=election.scenery.polling_day + timedelta(days=1)
        )


def _counted_regions(inputs: DeskInputs) -> tuple[str, ...]:
    counted = inputs.counted_result
    return () if counted is None else tuple(str(region) for region in counted["region"].unique())


def _truth(election: MadeUpElection, *, counted: tuple[str, ...]) -> pd.DataFrame:
    truth, scenery = election.truth, election.scenery
    polling_day = _with_counts(truth.polling_day, election=election, counted=counted)
    today = _with_counts(truth.at_register_end, election=election, counted=counted)
    open_pairs = [
        (region, code)
        for region, stands in zip(scenery.region_codes, scenery.standing(), strict=True)
        for code, there in zip(scenery.codes, stands, strict=True)
        if there and region not in counted
    ]
    pairs = pd.MultiIndex.from_tuples(open_pairs, names=["region", "code"])
    by_region = polling_day.reindex(pairs).reset_index()
    told = pd.concat(
        [
            _country(polling_day, election=election).assign(quantity=Quantity.SUPPORT_POLLING_DAY),
            by_region.assign(quantity=Quantity.SUPPORT_POLLING_DAY),
            _country(today, election=election).assign(quantity=Quantity.SUPPORT_TODAY),
            truth.seats.rename(columns={"seats": "truth"}).assign(quantity=Quantity.SEATS, region=COUNTRY),
        ]
    )
    return told[["quantity", "region", "code", "truth"]].astype({"truth": float}).reset_index(drop=True)


def _with_counts(support: pd.DataFrame, *, election: MadeUpElection, counted: tuple[str, ...]) -> pd.Series:
    """Support by region and code, percent; of a counted region its votes, as in what is published."""
    pair = ["region", "code"]
    true = support[support["region"] != COUNTRY].set_index(pair)["support"]
    votes = election.truth.polling_day.set_index(pair)["votes"].reindex(true.index)
    return true.where(~true.index.get_level_values("region").isin(counted), votes).rename("truth")


def _country(by_region: pd.Series, *, election: MadeUpElection) -> pd.DataFrame:
    """The country by turnout on polling day: region (blank), code, truth."""
    turnout = election.truth.regions.set_index("region")["weight_polling_day"]
    shares = by_region.unstack("region")[list(turnout.index)] @ turnout
    ordered = shares.reindex(list(election.scenery.codes)).rename("truth").rename_axis("code")
    return ordered.reset_index().assign(region=COUNTRY)
