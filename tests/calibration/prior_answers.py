"""What people answer: Dirichlet-multinomial figures, some of them published in whole percent only.

A rounded figure is drawn as a count and published as the interval of counts it may stand for. The row's other
figures are drawn among themselves, at the total that the rounded one leaves: what the model takes them for.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln
from scipy.stats import betabinom, dirichlet_multinomial

from models.arrays import Floats, RowArrays
from tests.calibration.prior_register import (
    COUNTED,
    COUNTED_DAY,
    HOUSES,
    PARTIES,
    REGIONS,
    ROUNDING_HOUSE,
    Register,
    weigh_days,
)

FERN, GORSE, OTHERS = 1, 2, 3


@dataclass(frozen=True)
class Answers:
    """The figures of all rows.

    Attributes
    ----------
    partition
        Which parties each cell holds, dims (row, cell, party).
    counts
        Answers in each cell, dims (row, cell); a rounded one stands at the middle of its interval.
    rounded
        Which rows have a rounded figure of Gorse, dims (row).
    lowest, highest
        Ends of its interval, dims (row), people.
    log_likelihood
        Log probability of all figures at the truth, without the coefficient of the counts.
    """

    partition: Floats
    counts: Floats
    rounded: NDArray[np.bool_]
    lowest: Floats
    highest: Floats
    log_likelihood: float


def draw_answers(
    rng: np.random.Generator,
    register: Register,
    *,
    expected: Floats,
    kappa: Floats,
    rho: Floats,
    standing: NDArray[np.bool_],
) -> Answers:
    """Ask every row's respondents.

    Parameters
    ----------
    expected
        What each row is expected to find, dims (row, party).
    kappa, rho
        Each house's weighting loss and floor of error, dims (house).
    standing
        Where parties stand, dims (region, party).
    """
    rows, cells = len(register.house), len(PARTIES)
    partition = _partition(register, standing)
    counts, lowest, highest = np.zeros((rows, cells)), np.zeros(rows), np.zeros(rows)
    rounded = (register.house == ROUNDING_HOUSE) & ~register.asks_together & (partition[:, GORSE, GORSE] > 0)
    log_likelihood = 0.0
    for row in range(rows):
        people = int(register.respondents[row])
        loss = 1.0 if register.effective[row] else kappa[register.house[row]]
        deff = loss + (register.poll_respondents[row] - 1) * rho[register.house[row]]
        precision = max(people - deff, 0.05 * people) / (deff - 1)
        weight = precision * partition[row] @ expected[row]
        exact = partition[row].any(axis=1)
        left = people
        if rounded[row]:
            exact[GORSE] = False
            percent, log_chance = _draw_rounded(rng, people, weight[GORSE], precision - weight[GORSE])
            counts[row, GORSE] = percent * people / 100
            lowest[row] = max(percent - 0.5, 0) * people / 100
            highest[row] = (percent + 0.5) * people / 100
            left = people - int(counts[row, GORSE])
            log_likelihood += log_chance
        counts[row, exact], log_density = _draw_counts(rng, left, weight[exact])
        log_likelihood += log_density
    return Answers(partition, counts, rounded, lowest, highest, log_likelihood)


def _partition(register: Register, standing: NDArray[np.bool_]) -> Floats:
    partition = np.tile(np.eye(len(PARTIES)), (len(register.house), 1, 1))
    for cell, rows in ((FERN, register.asks_together), (OTHERS, register.leaves_new_out)):
        partition[rows, GORSE, GORSE] = 0
        partition[rows, cell, GORSE] = 1
    # A party that stands in none of the row's regions is in no cell of it.
    return partition * (register.regions_of_row @ standing)[:, None, :]


def _draw_rounded(
    rng: np.random.Generator, people: int, weight: float, other_weight: float
) -> tuple[int, float]:
    """A count, rounded to whole percent, and the log probability of that percent."""
    count = rng.binomial(people, rng.beta(weight, other_weight))
    percent = int(np.floor(100 * count / people + 0.5))
    inside = np.arange(
        np.ceil(max(percent - 0.5, 0) * people / 100), np.floor((percent + 0.5) * people / 100) + 1
    )
    chance = betabinom.pmf(inside[inside <= people], people, weight, other_weight).sum()
    return percent, float(np.log(chance))


def _draw_counts(rng: np.random.Generator, people: int, weight: Floats) -> tuple[Floats, float]:
    """Dirichlet-multinomial counts and their log probability without its coefficient."""
    counts = rng.multinomial(people, rng.dirichlet(weight))
    coefficient = gammaln(people + 1) - gammaln(counts + 1).sum()
    return counts.astype(float), float(dirichlet_multinomial.logpmf(counts, weight, people) - coefficient)


def fill_answers(register: Register, answers: Answers, *, turnout: Floats) -> RowArrays:
    """Put rows and figures into the model's container; a region that has voted is a part of its own."""
    rows = len(register.house)
    row_of_part, days, mixes = [], [], []
    for row in range(rows):
        mix = turnout * register.regions_of_row[row] / turnout[register.regions_of_row[row]].sum()
        voted = (np.arange(len(REGIONS)) == COUNTED) & (register.first_day[row] > COUNTED_DAY)
        for asked, window in (
            (~voted, (register.first_day[row], register.last_day[row])),
            (voted, (COUNTED_DAY, COUNTED_DAY)),
        ):
            if (mix * asked).any():
                row_of_part.append(row)
                days.append(window)
                mixes.append(mix * asked)
    national, regional = zip(*[weigh_days(*window) for window in days], strict=True)
    small = np.flatnonzero(answers.rounded)
    return RowArrays(
        polls=tuple(f"poll {number}" for number in range(register.poll.max() + 1)),
        houses=HOUSES,
        poll_of_row=register.poll,
        house_of_row=register.house,
        row_of_part=np.array(row_of_part),
        national_weight=np.stack(national),
        region_weight=np.stack(regional),
        region_mix=np.stack(mixes),
        respondents=register.respondents,
        poll_respondents=register.poll_respondents,
        weighting_known=register.effective.astype(float),
        partition=answers.partition,
        answers=answers.counts,
        used=(answers.partition.sum(axis=2) > 0).astype(float),
        small_row=small,
        small_cell=np.full(len(small), GORSE),
        small_low=answers.lowest[small],
        small_high=answers.highest[small],
    )
