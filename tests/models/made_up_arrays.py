"""A small election as model arrays, simulated in plain numpy from a known truth."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date, timedelta

import numpy as np

from aggregator.estimate.knots import JoltDay, build_knots, knot_weights
from models.arrays import CountedArrays, CountryArrays, ElectionArrays, LeanArrays, RowArrays

POLLING_DAY = date(2026, 5, 17)
# High enough that a register of a few polls has some such figures.
SMALL_SHARE = 0.1


@dataclass(frozen=True)
class MadeUpTruth:
    """What the arrays were simulated from: national and regional support on polling day, house effects."""

    national: np.ndarray
    regional: np.ndarray
    house: np.ndarray


def made_up_arrays(
    seed: int = 1,
    *,
    parties: int = 4,
    regions: int = 3,
    houses: int = 4,
    polls: int = 60,
    weeks: int = 40,
    anchored: bool = True,
    free: int = 0,
    absent: bool = False,
    small: bool = False,
    messy: bool = False,
    shared_lean: float = 0.025 / np.sqrt(0.24),
) -> tuple[ElectionArrays, MadeUpTruth]:
    """Simulate an election and the polls of it.

    ``free`` parties at the end have no last result; ``absent`` leaves the first party out of the last
    region; ``small`` marks figures below 10 % as intervals; ``messy`` adds two eras of the first house,
    two modes, a second population, a jolt, a ramp, and a first region that has voted and been counted. The
    answers do not know of these: what they need is places in the arrays.
    """
    rng = np.random.default_rng(seed)
    share = rng.dirichlet(np.full(parties, 8.0))
    turnout = rng.dirichlet(np.full(regions, 12.0))
    base = np.log(share) + 0.2 * rng.normal(size=(regions, parties)) * (regions > 1)
    standing = np.ones((regions, parties), dtype=bool)
    if absent:
        standing[-1, 0] = False
    size = np.sqrt(0.15 / share)
    last_result = POLLING_DAY - timedelta(days=7 * weeks + 300)
    first_fieldwork = POLLING_DAY - timedelta(days=7 * weeks)
    knots = build_knots(
        last_result=last_result if anchored else None,
        first_fieldwork=first_fieldwork,
        middle_fieldwork=POLLING_DAY - timedelta(days=3 * weeks),
        polling_day=POLLING_DAY,
        jolts=[JoltDay(POLLING_DAY - timedelta(weeks=weeks // 2), 4.0)] if messy else (),
        ramp=messy,
    )
    zero = POLLING_DAY.toordinal() - knots.national_day[-1]
    walk = _walk(rng, knots.national_step, (parties,), 0.035 * size)
    deviation = _walk(rng, knots.region_step, (regions, parties), 0.0175 * size)
    deviation -= np.einsum("r,krp->kp", turnout, deviation)[:, None]
    house = rng.normal(size=(houses, parties)) * 0.06 * size
    lean_size = shared_lean / np.sqrt(share)
    angle = knots.lean_clock * np.arccos(1 / 3)
    ends = rng.normal(size=(2, parties))
    lean = (np.cos(angle)[:, None] * ends[0] + np.sin(angle)[:, None] * ends[1]) * lean_size

    end = np.sort(rng.integers(0, 7 * weeks - 8, size=polls)) + first_fieldwork.toordinal() + 4.0 - zero
    first = end - rng.integers(0, 4, size=polls)
    national_weight = knot_weights(knots.national_day, first_day=first, last_day=end)
    region_weight = knot_weights(knots.region_day, first_day=first, last_day=end)
    house_of_row = rng.integers(0, houses, size=polls)
    regional = (rng.random(polls) < 0.3) & (regions > 1)
    mix = np.where(regional[:, None], np.eye(regions)[rng.integers(0, regions, size=polls)], turnout)
    respondents = np.where(regional, 500.0, 1000.0) + rng.integers(0, 500, size=polls)
    log_support = (
        base
        + np.where(standing, 0, -40)
        + (national_weight @ (walk + lean) + house[house_of_row])[:, None, :]
        + np.einsum("nk,krp->nrp", region_weight, deviation)
    )
    expected = np.einsum("nr,nrp->np", mix, _softmax(log_support))
    kappa, rho = 1.4, 0.0004
    deff = kappa + (respondents - 1) * rho
    precision = (respondents - deff) / (deff - 1)
    answers = np.stack(
        [
            rng.multinomial(int(n), rng.dirichlet(np.maximum(a * q, 1e-9)))
            for n, a, q in zip(respondents, precision, expected, strict=True)
        ]
    ).astype(float)
    partition = np.broadcast_to(np.eye(parties), (polls, parties, parties)).copy()
    lumped = rng.random(polls) < 0.25
    if parties > 2:
        # Some polls report the two last parties as one.
        answers[lumped, -2] += answers[lumped, -1]
        answers[lumped, -1] = 0
        partition[lumped, -2, -1] = 1
        partition[lumped, -1, -1] = 0
    # A party that stands in none of the row's regions is in no cell of it.
    partition *= (mix @ standing > 0)[:, None, :]
    used = partition.sum(axis=2).clip(0, 1)
    row, cell = (
        np.nonzero(((answers / respondents[:, None]) < SMALL_SHARE) & (used > 0)) if small else ([], [])
    )
    half = 0.005 * respondents[row]
    arrays = ElectionArrays(
        country=CountryArrays(
            parties=tuple(f"P{i}" for i in range(parties)),
            regions=tuple(f"R{i}" for i in range(regions)),
            turnout=turnout,
            standing=standing,
            start_log_share=np.where(
                np.arange(parties) < (parties - free if anchored else 0),
                _log_share(base),
                np.log(0.02 if anchored else 1 / parties),
            ),
            reference_share=share,
            lean_size=np.full(parties, shared_lean),
            pilot_share=share,
            free_party=np.arange(parties - free if anchored else 0, parties),
        ),
        knots=knots,
        rows=RowArrays(
            polls=tuple(f"poll {i}" for i in range(polls)),
            houses=tuple(f"House {i}" for i in range(houses)),
            poll_of_row=np.arange(polls),
            house_of_row=house_of_row,
            row_of_part=np.arange(polls),
            national_weight=national_weight,
            region_weight=region_weight,
            region_mix=mix,
            respondents=respondents,
            poll_respondents=respondents,
            weighting_known=np.zeros(polls),
            partition=partition,
            answers=answers,
            used=used,
            small_row=row,
            small_cell=cell,
            small_low=np.maximum(answers[row, cell] - half, 0),
            small_high=answers[row, cell] + half,
        ),
        leans=plain_leans(house_of_row, houses=houses, parties=parties),
    )
    if messy:
        arrays = _with_mess(arrays, voted=float(7 * 2), rng=rng)
    truth = _softmax(base + np.where(standing, 0, -40) + walk[-1] + deviation[-1])
    return arrays, MadeUpTruth(national=turnout @ truth, regional=truth, house=house)


def plain_leans(house_of_row: np.ndarray, *, houses: int, parties: int) -> LeanArrays:
    """Leans of houses alone."""
    none = np.full(len(house_of_row), houses)
    return LeanArrays(
        eras=(),
        era_house=np.empty(0, dtype=np.int64),
        modes=(),
        mode_share=np.empty(0),
        populations=(),
        formations=(),
        formation_members=np.empty((0, parties)),
        terms_of_row=np.stack([house_of_row, none, none, none], axis=1),
    )


def _with_mess(arrays: ElectionArrays, *, voted: float, rng: np.random.Generator) -> ElectionArrays:
    """Add eras, modes, a population, an alliance asked as one, and a region that voted early."""
    rows, knots, parties = arrays.rows, arrays.knots, len(arrays.country.parties)
    count, houses = len(rows.respondents), len(rows.houses)
    none = houses + 2 + 2 + 1 + 1
    terms = np.stack(
        [
            rows.house_of_row,
            np.where(rows.house_of_row == 0, houses + rng.integers(0, 2, size=count), none),
            houses + 2 + (rows.house_of_row % 2),
            np.where(rng.random(count) < 0.4, houses + 4, none),
            np.where(rng.random(count) < 0.3, houses + 5, none),
        ],
        axis=1,
    )
    leans = LeanArrays(
        eras=("House 0, first", "House 0, second"),
        era_house=np.zeros(2, dtype=np.int64),
        modes=("online", "telephone"),
        mode_share=np.bincount(np.arange(houses) % 2, minlength=2) / houses,
        populations=("adults",),
        formations=("BOTH",),
        formation_members=(np.arange(parties) < 2)[None].astype(float),
        terms_of_row=terms,
    )
    day = np.array([knots.national_day[-1] - voted])
    frozen_national = knot_weights(knots.national_day, first_day=day, last_day=day)
    frozen_region = knot_weights(knots.region_day, first_day=day, last_day=day)
    split = np.flatnonzero((rows.region_mix[:, 0] > 0) & (rows.region_mix[:, 0] < 1))[::2]
    first_apart = np.zeros((len(split), rows.region_mix.shape[1]))
    first_apart[:, 0] = rows.region_mix[split, 0]
    others = rows.region_mix.copy()
    others[split, 0] = 0
    return replace(
        arrays,
        leans=leans,
        rows=replace(
            rows,
            row_of_part=np.append(rows.row_of_part, split),
            national_weight=np.vstack([rows.national_weight, np.repeat(frozen_national, len(split), 0)]),
            region_weight=np.vstack([rows.region_weight, np.repeat(frozen_region, len(split), 0)]),
            region_mix=np.vstack([others, first_apart]),
        ),
        counted=CountedArrays(
            region=np.zeros(1, dtype=np.int64),
            share=rng.dirichlet(np.full(parties, 8.0), size=1),
            national_weight=frozen_national,
            region_weight=frozen_region,
            people=2000.0,
        ),
    )


def _walk(
    rng: np.random.Generator, step: np.ndarray, shape: tuple[int, ...], scale: np.ndarray
) -> np.ndarray:
    steps = rng.normal(size=(len(step), *shape)) * scale
    steps *= np.sqrt(step).reshape(-1, *[1] * len(shape))
    return np.concatenate([np.zeros((1, *shape)), np.cumsum(steps, axis=0)])


def _softmax(log_support: np.ndarray) -> np.ndarray:
    raised = np.exp(log_support)
    return raised / raised.sum(axis=-1, keepdims=True)


def _log_share(base: np.ndarray) -> np.ndarray:
    return np.log(_softmax(base))
