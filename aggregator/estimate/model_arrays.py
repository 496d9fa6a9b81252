"""The only door from the desk's tables to the model's arrays."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np
import pandas as pd

from aggregator.estimate.knots import JoltDay, build_knots, knot_weights
from aggregator.estimate.lean_sizes import contest_lean_size
from aggregator.estimate.lean_terms_of_rows import lean_arrays, list_eras
from aggregator.estimate.past_support import country_arrays, last_shares, votes_by_region
from aggregator.estimate.published_rows import Row, cell_arrays, read_rows
from aggregator.estimate.row_parts import part_arrays
from aggregator.inputs.desk_inputs import DeskInputs
from models.arrays import CountedArrays, CountryArrays, ElectionArrays, KnotArrays, RowArrays
from models.counted_regions import people_of_a_count
from models.priors import Priors


@dataclass(frozen=True)
class ContestArrays:
    """A contest as the model sees it.

    Attributes
    ----------
    arrays
        The arrays of the model.
    eras
        Eras of the houses, from :func:`aggregator.estimate.lean_terms_of_rows.list_eras`.
    """

    arrays: ElectionArrays
    eras: pd.DataFrame


def build_arrays(inputs: DeskInputs, *, priors: Priors) -> ContestArrays:
    """Turn checked desk inputs into the arrays of the model.

    Parties and regions keep the order of the contest file, houses are sorted by name.
    """
    contest = inputs.contest
    standing = np.array(
        [[contest.stands_in(p, r) for p in contest.party_codes] for r in contest.region_codes]
    )
    last = last_shares(inputs)
    rows = read_rows(inputs)
    eras = list_eras(rows)
    cells = cell_arrays(rows, parties=contest.party_codes)
    respondents = np.array([row.respondents for row in rows])
    country = country_arrays(
        contest,
        last=last,
        standing=standing,
        cells=cells,
        respondents=respondents,
        lean_size=contest_lean_size(inputs, priors=priors),
    )
    knots = _knots(inputs)
    houses = tuple(dict.fromkeys(eras["house"]))
    polls = tuple(dict.fromkeys(row.poll for row in rows))
    parts = part_arrays(rows, contest=contest, knots=knots, turnout=last.turnout)
    arrays = ElectionArrays(
        country=country,
        knots=knots,
        rows=RowArrays(
            polls=polls,
            houses=houses,
            poll_of_row=_positions(rows, "poll", polls),
            house_of_row=_positions(rows, "house", houses),
            **vars(parts),
            respondents=respondents,
            poll_respondents=np.array([row.poll_respondents for row in rows]),
            weighting_known=np.array([float(row.weighting_known) for row in rows]),
            **vars(cells),
        ),
        leans=lean_arrays(rows, eras=eras, contest=contest),
        counted=_counted(inputs, country=country, knots=knots, priors=priors),
    )
    arrays.check()
    return ContestArrays(arrays=arrays, eras=eras)


def _positions(rows: list[Row], name: str, labels: tuple[str, ...]) -> np.ndarray:
    place = {label: i for i, label in enumerate(labels)}
    return np.array([place[getattr(row, name)] for row in rows], dtype=np.int64)


def _knots(inputs: DeskInputs) -> KnotArrays:
    contest, polls = inputs.contest, inputs.polls
    anchored = inputs.last_result is not None and contest.last_result is not None
    return build_knots(
        last_result=contest.last_result.date if anchored and contest.last_result else None,
        first_fieldwork=polls["start"].min().date(),
        middle_fieldwork=_middle(polls),
        polling_day=contest.last_polling_day,
        jolts=[JoltDay(jolt.date, jolt.weeks) for jolt in contest.jolts],
        ramp=contest.model.ramp,
    )


def _middle(polls: pd.DataFrame) -> date:
    return polls["end"].sort_values().iloc[len(polls) // 2].date()


def _counted(
    inputs: DeskInputs, *, country: CountryArrays, knots: KnotArrays, priors: Priors
) -> CountedArrays | None:
    """Counted regions; None while there are none."""
    if inputs.counted_result is None:
        return None
    contest = inputs.contest
    votes = votes_by_region(inputs.counted_result, contest)
    counted = np.flatnonzero(votes.sum(axis=1) > 0)
    day = np.array(
        [contest.polling_day_of(contest.region_codes[r]).toordinal() for r in counted], dtype=float
    ) - (contest.last_polling_day.toordinal() - knots.national_day[-1])
    size = country.lean_size if contest.model.shared_lean else np.zeros_like(country.lean_size)
    return CountedArrays(
        region=counted,
        share=votes[counted] / votes[counted].sum(axis=1, keepdims=True),
        national_weight=knot_weights(knots.national_day, first_day=day, last_day=day),
        region_weight=knot_weights(knots.region_day, first_day=day, last_day=day),
        people=people_of_a_count(size, pilot_share=country.pilot_share, priors=priors),
    )
