"""Who asks whom, when and how: the register of an election drawn from the prior, and its calendar.

The design of a register says nothing about opinion, so any will do. This one holds a case of everything the
model knows: breakdowns by region, two modes, two populations, an era of method, an alliance given as one
figure, a party left among others, effective samples, small figures rounded, a region that votes early.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from aggregator.estimate.knots import knot_weights
from models.arrays import Floats, Indices, KnotArrays, LeanArrays

# The third party is new, the last is all the rest together.
PARTIES = ("Elm", "Fern", "Gorse", "others")
REGIONS = ("Dale", "Moor", "Strand")
HOUSES = ("Ash", "Birch", "Cedar", "Dogwood", "Elder")
ONLINE, TELEPHONE = 0, 1
# The house that changed its method, once for each of its eras.
ERA_HOUSE = np.array([0, 0])
# The house that publishes the new party's figure as whole percent, and that asks by telephone alone.
ROUNDING_HOUSE, TELEPHONE_HOUSE, TWO_MODES_HOUSE = 2, 3, 4

# Days since the last result. The region that votes early is counted.
FIRST_FIELDWORK, POLLING_DAY = 280, 420
COUNTED, COUNTED_DAY = 2, 385.0
JOLT_DAY, JOLT_WEEKS = 350, 4.0
FIRST_ALLIANCE_DAY = 320.0

COUNTRYWIDE, BREAKDOWNS, ONE_REGION = 26, 3, 3
# Whole percents of these are odd numbers of people, so that no count lies on the border of two roundings.
SAMPLES, REGION_SAMPLES = (700.0, 900.0, 1100.0), (300.0, 500.0)


def _lay_knots() -> KnotArrays:
    """Weekly national and four-weekly regional knots; one step from the last result to the campaign."""

    def between(day: Floats) -> tuple[Floats, Floats, Floats]:
        steps = np.diff(day)
        jolt = np.where((day[:-1] < JOLT_DAY) & (day[1:] >= JOLT_DAY), JOLT_WEEKS, 0.0)
        # The ramp rises from 0, sixty days before polling day, to 1; its mean over each step, day by day.
        rise = np.clip(1 - (POLLING_DAY - (np.arange(POLLING_DAY) + 0.5)) / 60, 0, None)
        ramp = np.array([rise[int(a) : int(b)].mean() for a, b in pairwise(day)])
        return steps / 7, jolt, ramp

    national = np.append(0.0, np.arange(FIRST_FIELDWORK, POLLING_DAY + 1, 7.0))
    region = np.append(0.0, np.arange(FIRST_FIELDWORK, POLLING_DAY + 1, 28.0))
    (national_step, national_jolt, national_ramp) = between(national)
    (region_step, region_jolt, region_ramp) = between(region)
    return KnotArrays(
        national_day=national,
        region_day=region,
        national_step=national_step,
        region_step=region_step,
        national_jolt=national_jolt,
        region_jolt=region_jolt,
        national_ramp=national_ramp,
        region_ramp=region_ramp,
        lean_clock=national / POLLING_DAY,
        lean_reference=(FIRST_FIELDWORK + POLLING_DAY) / 2 / POLLING_DAY,
    )


KNOTS = _lay_knots()


def weigh_days(first: float, last: float) -> tuple[Floats, Floats]:
    """Weights of the national and the regional knots over a window of days, both ends included."""
    days = {"first_day": np.array([first]), "last_day": np.array([last])}
    return knot_weights(KNOTS.national_day, **days)[0], knot_weights(KNOTS.region_day, **days)[0]


@dataclass(frozen=True)
class Register:
    """The rows of a register before anyone answers; dims (row) but where said.

    Attributes
    ----------
    poll, house, mode, era
        Positions; the era is that of the house which changed its method.
    first_day, last_day
        Fieldwork, days since the last result.
    regions_of_row
        Whether a region is asked, dims (row, region).
    respondents, poll_respondents
        Of the row and of its whole poll.
    effective
        Whether the desk gave an effective sample.
    asks_adults, asks_together, leaves_new_out
        Whether the row asks adults rather than voters; gives Fern and Gorse as one figure; leaves Gorse among
        others.
    """

    poll: Indices
    house: Indices
    mode: Indices
    era: Indices
    first_day: Floats
    last_day: Floats
    regions_of_row: NDArray[np.bool_]
    respondents: Floats
    poll_respondents: Floats
    effective: NDArray[np.bool_]
    asks_adults: NDArray[np.bool_]
    asks_together: NDArray[np.bool_]
    leaves_new_out: NDArray[np.bool_]


def draw_register(rng: np.random.Generator) -> Register:
    """Draw days, houses and ways of asking; the numbers of polls of each kind are fixed."""
    polls = COUNTRYWIDE + BREAKDOWNS + ONE_REGION
    house = rng.permutation(np.arange(polls) % len(HOUSES))
    first = rng.integers(FIRST_FIELDWORK, POLLING_DAY - 6, size=polls).astype(float)
    # Polls with figures by region come before the early vote: afterwards nobody asks there alone.
    first[COUNTRYWIDE:] = rng.integers(FIRST_FIELDWORK, int(COUNTED_DAY) - 6, size=polls - COUNTRYWIDE)
    by_telephone = (house == TELEPHONE_HOUSE) | ((house == TWO_MODES_HOUSE) & (rng.random(polls) < 0.5))
    together = (first > FIRST_ALLIANCE_DAY) & (rng.random(polls) < 0.3)
    register = Register(
        poll=np.arange(polls),
        house=house,
        mode=np.where(by_telephone, TELEPHONE, ONLINE),
        era=(first > np.median(first)).astype(int),
        first_day=first,
        last_day=first + rng.integers(0, 5, size=polls),
        regions_of_row=np.ones((polls, len(REGIONS)), dtype=bool),
        respondents=rng.choice(SAMPLES, size=polls),
        poll_respondents=np.zeros(polls),
        effective=rng.permutation(polls) < 4,
        asks_adults=rng.random(polls) < 0.3,
        asks_together=together,
        leaves_new_out=~together & (house != ROUNDING_HOUSE) & (rng.random(polls) < 0.2),
    )
    return _split_into_regions(rng, register)


def _split_into_regions(rng: np.random.Generator, register: Register) -> Register:
    """Turn the last polls into one row, or one row for each region, of samples of their own."""
    region_of_row = [np.full(COUNTRYWIDE, -1)]
    row_of = [np.arange(COUNTRYWIDE)]
    for poll in range(COUNTRYWIDE, COUNTRYWIDE + BREAKDOWNS + ONE_REGION):
        regions = np.arange(len(REGIONS)) if poll < COUNTRYWIDE + BREAKDOWNS else rng.integers(0, 3, size=1)
        region_of_row.append(regions)
        row_of.append(np.full(len(regions), poll))
    rows, region = np.concatenate(row_of), np.concatenate(region_of_row)
    respondents = np.where(region < 0, register.respondents[rows], rng.choice(REGION_SAMPLES, size=len(rows)))
    taken = {name: getattr(register, name)[rows] for name in register.__dataclass_fields__}
    asked = np.where(region[:, None] < 0, True, np.arange(len(REGIONS)) == region[:, None])
    return replace(
        Register(**taken),
        regions_of_row=asked,
        respondents=respondents,
        poll_respondents=np.bincount(rows, weights=respondents)[rows],
    )


def mode_shares(register: Register) -> Floats:
    """Share of the houses in each mode; a house in both counts by its share of polls; dims (mode)."""
    shares = np.zeros((len(HOUSES), 2))
    for house in range(len(HOUSES)):
        polls = np.unique(register.poll[register.house == house])
        modes = [register.mode[register.poll == poll][0] for poll in polls]
        shares[house] = np.bincount(modes, minlength=2) / len(modes)
    return shares.mean(axis=0)


def fill_leans(register: Register) -> LeanArrays:
    """The terms of each row by number: houses, eras, modes, populations, formations, none."""
    houses, eras = len(HOUSES), len(ERA_HOUSE)
    first_mode = houses + eras
    adults, together, none = first_mode + 2, first_mode + 3, first_mode + 4
    return LeanArrays(
        eras=("until the change", "since the change"),
        era_house=ERA_HOUSE,
        modes=("online", "telephone"),
        mode_share=mode_shares(register),
        populations=("adults",),
        formations=("Fern and Gorse",),
        formation_members=np.array([[0.0, 1.0, 1.0, 0.0]]),
        terms_of_row=np.column_stack(
            [
                register.house,
                np.where(register.house == ERA_HOUSE[0], houses + register.era, none),
                first_mode + register.mode,
                np.where(register.asks_adults, adults, none),
                np.where(register.asks_together, together, none),
            ]
        ),
    )
