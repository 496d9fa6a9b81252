"""Elections drawn from the model's prior, in plain numpy: what the model says of the world before any poll.

Simulation-based calibration needs a second hand. Nothing here calls the model: every formula is written anew
from its definition in ``docs/method.md``, every number of the priors is written down again, and only the
containers and the weights of knots are shared. Where both hands agree, ranks are uniform.

The register keeps the same number of rows, houses and knots in every election, so that one compiled model
serves them all. Parties, scales, leans, days and answers are drawn anew each time.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import CountedArrays, CountryArrays, ElectionArrays, Floats
from tests.calibration.prior_answers import draw_answers, fill_answers
from tests.calibration.prior_register import (
    COUNTED,
    COUNTED_DAY,
    ERA_HOUSE,
    HOUSES,
    KNOTS,
    PARTIES,
    POLLING_DAY,
    REGIONS,
    Register,
    draw_register,
    fill_leans,
    mode_shares,
    weigh_days,
)

# The typical share of each party and the size of the error all polls share are fixed before anything is
# drawn: a prior that looked at the polls would not be one.
REFERENCE_SHARE = np.array([0.42, 0.34, 0.08, 0.16])
# With it a counted region is a sample of 2,400 people, a whole number: 1 / (.4 c)².
LEAN_SIZE = np.full(4, 1 / (0.4 * np.sqrt(2400)))
COUNTED_PEOPLE = 2400
FREE = 2
# The new party does not stand in the first region.
STANDING = np.array([[True, True, False, True], [True] * 4, [True] * 4])
NEW_PARTY_SHARE = 0.02

TODAY = 399.0


@dataclass(frozen=True)
class Scales:
    """Everything that sets how large movements and errors are.

    Attributes
    ----------
    drift, house
        Dims (party), log units (drift per √week).
    shared_lean
        Dims (party).
    region_ratio, ramp_log_height
        Numbers.
    kappa, rho
        Dims (house).
    """

    drift: Floats
    house: Floats
    shared_lean: Floats
    region_ratio: float
    ramp_log_height: float
    kappa: Floats
    rho: Floats


@dataclass(frozen=True)
class Leans:
    """What makes figures differ from support; all in log units.

    Attributes
    ----------
    shared
        At the national knots, dims (knot, party).
    shared_at_middle
        On the register's middle day, dims (party).
    houses, eras, modes, populations, formations
        Dims (label, party).
    """

    shared: Floats
    shared_at_middle: Floats
    houses: Floats
    eras: Floats
    modes: Floats
    populations: Floats
    formations: Floats


@dataclass(frozen=True)
class Opinion:
    """Support over time.

    Attributes
    ----------
    national
        The national swing, start of the new party included, dims (national knot, party).
    swing
        Each region's own swing, start of the new party included, dims (regional knot, region, party).
    own_support
        The region's own support that this makes of its last result, same dims.
    turnout
        Dims (region).
    """

    national: Floats
    swing: Floats
    own_support: Floats
    turnout: Floats

    def by_region(self, national_weight: Floats, region_weight: Floats, *, beside: Floats) -> Floats:
        """Shares of each region at weighted knots, ``beside`` added in log units; dims (region, party)."""
        raised = np.exp(national_weight @ self.national + beside) * np.einsum(
            "k,krp->rp", region_weight, self.own_support
        )
        return raised / raised.sum(axis=1, keepdims=True)


@dataclass(frozen=True)
class PriorElection:
    """One election: what the model is given, and the truth behind it.

    Attributes
    ----------
    arrays
        The contest and its polls.
    scales, leans, opinion
        The truth about sizes, about houses and about support.
    log_likelihood
        Of all answers, without the coefficients that no parameter enters.
    national_today, national_polling_day
        Dims (party), share.
    regional_polling_day
        Dims (region, party), share.
    """

    arrays: ElectionArrays
    scales: Scales
    leans: Leans
    opinion: Opinion
    log_likelihood: float
    national_today: Floats
    national_polling_day: Floats
    regional_polling_day: Floats


def draw_election(rng: np.random.Generator) -> PriorElection:
    """Draw an election and its polls from the prior."""
    turnout = rng.dirichlet(np.full(len(REGIONS), 20.0))
    last_result = _draw_last_result(rng)
    scales = _draw_scales(rng)
    register = draw_register(rng)
    leans = _draw_leans(rng, scales, register)
    opinion = _draw_opinion(rng, scales, leans, last_result, turnout)
    answers = draw_answers(
        rng,
        register,
        expected=_expected_shares(opinion, leans, register),
        kappa=scales.kappa,
        rho=scales.rho,
        standing=STANDING,
    )
    counted = _draw_counted(rng, opinion)
    arrays = ElectionArrays(
        country=CountryArrays(
            parties=PARTIES,
            regions=REGIONS,
            turnout=turnout,
            standing=STANDING,
            start_log_share=np.log(last_result),
            reference_share=REFERENCE_SHARE,
            lean_size=LEAN_SIZE,
            pilot_share=REFERENCE_SHARE,
            free_party=np.array([FREE]),
        ),
        knots=KNOTS,
        rows=fill_answers(register, answers, turnout=turnout),
        leans=fill_leans(register),
        counted=counted,
    )
    return PriorElection(
        arrays=arrays,
        scales=scales,
        leans=leans,
        opinion=opinion,
        log_likelihood=answers.log_likelihood,
        **_published(rng, opinion, counted),
    )


def _draw_last_result(rng: np.random.Generator) -> Floats:
    """Shares of the last result, and the prior median of the new party; dims (region, party)."""
    share = REFERENCE_SHARE.copy()
    share[FREE] = 0
    regional = share * np.exp(0.25 * rng.normal(size=STANDING.shape))
    regional /= regional.sum(axis=1, keepdims=True)
    regional[:, FREE] = NEW_PARTY_SHARE
    return regional


def _draw_scales(rng: np.random.Generator) -> Scales:
    """Sizes go as √(.15/p); .35 is how far one party's strays from the common one."""
    size = np.sqrt(0.15 / REFERENCE_SHARE)
    parties, houses = len(PARTIES), len(HOUSES)
    drift = np.exp(rng.normal(np.log(0.035), 0.6) + 0.35 * rng.normal(size=parties)) * size
    house = np.exp(rng.normal(np.log(0.06), 0.5) + 0.35 * rng.normal(size=parties)) * size
    return Scales(
        drift=drift,
        house=house,
        shared_lean=np.sqrt(LEAN_SIZE**2 / REFERENCE_SHARE + house**2 / houses),
        region_ratio=float(2 / (1 + 3 * np.exp(-0.67 * rng.normal()))),
        ramp_log_height=float(0.5 * rng.normal()),
        kappa=1 + np.exp(rng.normal(np.log(0.4), 0.4) + 0.4 * rng.normal(size=houses)),
        rho=np.exp(rng.normal(np.log(0.0004), 0.7) + 0.5 * rng.normal(size=houses)),
    )


def _draw_leans(rng: np.random.Generator, scales: Scales, register: Register) -> Leans:
    parties = len(PARTIES)

    def terms(count: int, part: float) -> Floats:
        return part * scales.house * rng.normal(size=(count, parties))

    # Two independent ends, turned into each other: correlation 1/3 from last result to polling day.
    angle = np.arccos(1 / 3) * np.append(KNOTS.lean_clock, KNOTS.lean_reference)[:, None]
    first, last = scales.shared_lean * rng.normal(size=(2, parties))
    shared = np.cos(angle) * first + np.sin(angle) * last
    houses, eras, modes = terms(len(HOUSES), 1), terms(len(ERA_HOUSE), 0.5), terms(2, 0.7)
    return Leans(
        shared=shared[:-1],
        shared_at_middle=shared[-1],
        houses=houses - houses.mean(axis=0),
        # All eras here belong to one house.
        eras=eras - eras.mean(axis=0),
        modes=modes - mode_shares(register) @ modes,
        populations=terms(1, 0.7),
        formations=terms(1, 0.7),
    )


def _draw_opinion(
    rng: np.random.Generator, scales: Scales, leans: Leans, last_result: Floats, turnout: Floats
) -> Opinion:
    """Walks in opinion time from the last result, and where the new party starts."""

    def walk(weeks: Floats, jolt: Floats, ramp: Floats, scale: Floats, shape: tuple[int, ...]) -> Floats:
        time = weeks * np.exp(scales.ramp_log_height * ramp) + jolt
        steps = rng.normal(size=(len(time), *shape)) * scale
        steps = steps * np.sqrt(time).reshape(-1, *[1] * len(shape))
        return np.concatenate([np.zeros((1, *shape)), steps.cumsum(axis=0)])

    national = walk(
        KNOTS.national_step, KNOTS.national_jolt, KNOTS.national_ramp, scales.drift, (len(PARTIES),)
    )
    swing = walk(
        KNOTS.region_step,
        KNOTS.region_jolt,
        KNOTS.region_ramp,
        scales.region_ratio * scales.drift,
        STANDING.shape,
    )
    swing = swing - np.einsum("r,krp->kp", turnout, swing)[:, None, :]
    # Polls see the new party with the shared lean: what is drawn is its polled start in the middle of the
    # register.
    national[:, FREE] += 1.2 * rng.normal() - leans.shared_at_middle[FREE]
    swing[:, :, FREE] += 0.5 * rng.normal(size=len(REGIONS))
    return Opinion(
        national=national,
        swing=swing,
        own_support=np.stack([_fitted(last_result * STANDING, move, turnout) for move in swing]),
        turnout=turnout,
    )


def _fitted(last_result: Floats, swing: Floats, turnout: Floats) -> Floats:
    """Two rounds of fitting the moved last result to regions' and parties' sums; dims (region, party)."""
    target = turnout @ (last_result / last_result.sum(axis=1)[:, None])
    table = last_result * np.exp(swing)
    for _ in range(2):
        table = table / table.sum(axis=1)[:, None]
        table = table * target / (turnout @ table)
    return table


def _expected_shares(opinion: Opinion, leans: Leans, register: Register) -> Floats:
    """What each row is expected to find, dims (row, party)."""
    expected = np.zeros((len(register.house), len(PARTIES)))
    for row in range(len(expected)):
        lean = leans.houses[register.house[row]] + leans.modes[register.mode[row]]
        if register.house[row] == ERA_HOUSE[0]:
            lean = lean + leans.eras[register.era[row]]
        if register.asks_adults[row]:
            lean = lean + leans.populations[0]
        if register.asks_together[row]:
            lean = lean + leans.formations[0]
        asked = np.flatnonzero(register.regions_of_row[row])
        weight = opinion.turnout[asked] / opinion.turnout[asked].sum()
        for region, share in zip(asked, weight, strict=True):
            # A region that has voted is asked what it voted.
            voted = region == COUNTED and register.first_day[row] > COUNTED_DAY
            days = (COUNTED_DAY, COUNTED_DAY) if voted else (register.first_day[row], register.last_day[row])
            national, regional = weigh_days(*days)
            seen = opinion.by_region(national, regional, beside=national @ leans.shared + lean)
            expected[row] += share * seen[region]
    return expected


def _draw_counted(rng: np.random.Generator, opinion: Opinion) -> CountedArrays:
    """The count of the region that voted early: a simple random sample of its support, without any lean."""
    national, regional = weigh_days(COUNTED_DAY, COUNTED_DAY)
    support = opinion.by_region(national, regional, beside=np.zeros(len(PARTIES)))[COUNTED]
    return CountedArrays(
        region=np.array([COUNTED]),
        share=rng.multinomial(COUNTED_PEOPLE, support)[None, :] / COUNTED_PEOPLE,
        national_weight=national[None, :],
        region_weight=regional[None, :],
        people=float(COUNTED_PEOPLE),
    )


def _published(rng: np.random.Generator, opinion: Opinion, counted: CountedArrays) -> dict[str, Floats]:
    """True support as it is published: with regional leans and a turnout that no poll can tell.

    The region that has been counted stands at its count from its polling day on.
    """
    lean = 0.4 * LEAN_SIZE / np.sqrt(REFERENCE_SHARE) * rng.normal(size=STANDING.shape)
    lean = lean - opinion.turnout @ lean

    def support(day: float) -> Floats:
        national, regional = weigh_days(day, day)
        share = opinion.by_region(national, regional, beside=np.zeros(len(PARTIES))) * np.exp(lean)
        share /= share.sum(axis=1, keepdims=True)
        share[COUNTED] = counted.share[0]
        return share

    regional = support(float(POLLING_DAY))
    # Turnout follows each party a little, the same way in all regions, and has a part of each region's own.
    follows = (regional - opinion.turnout @ regional) @ (0.2 * rng.normal(size=len(PARTIES)))
    turnout = opinion.turnout * np.exp(follows + 0.04 * rng.normal(size=len(REGIONS)))
    turnout /= turnout.sum()
    return {
        "national_today": turnout @ support(TODAY),
        "national_polling_day": turnout @ regional,
        "regional_polling_day": regional,
    }
