"""The voters of an invented election: its last result, and how support moves until polling day."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from data_demo.made_up_before_last import as_it_stood, draw_next_votes
from data_demo.made_up_local_noise import draw_local_sd
from data_demo.made_up_scenery import OTHERS, Scenery
from data_demo.made_up_time import opinion_days, still_after_voting

SIGMA_AT_15_PERCENT = 0.035
"""Log points per square root of a week that a party of 15 % drifts."""
REGIONAL_DRIFT_RATIO = 0.5
PARTY_NOISE = 0.3
"""Log sd of the party scales about their law."""
LEAN_SCALE = 0.025 / np.sqrt(0.24)
"""The shared lean's sd is this over the root of the share: 2.5 points at 40 %."""
LEAN_TURN = np.arccos(1 / 3)
"""Angle by which the shared lean turns between two elections: correlation 1/3."""
REGIONAL_LEAN_RATIO = 0.4
UNDECIDED_STRAY = 0.15 / np.sqrt(0.24)
"""How far the undecided break from the decided, over the root of the share: 15 points at 40 %."""
NEW_PARTY_SPREAD = 0.5
SEAT_VOTES = 21_000


@dataclass(frozen=True)
class Country:
    """The last result and the true support since then.

    Attributes
    ----------
    last_votes
        Votes by seat at the last election: columns seat, name, region, then the parties that stood.
    baseline
        Log last share after ``inherits``, dims (region, party); minus infinity where a party is absent.
    weights
        Share of the last turnout by region, dims (region,).
    days
        Every day from the last election to polling day.
    log_support
        Log of the true support, dims (day, region, party).
    sigma
        National drift, log points per square root of a week, dims (party,).
    opinion_days
        Opinion time that passes up to each day since its eve, in usual days, dims (day,).
    lean_scale, undecided_scale
        Sd of the shared lean, and of what the undecided add to it, log points, dims (party,).
    lean
        Shared lean, log points, dims (day, region, party), regional part and undecided included.
    undecided_lean
        The part of it that is due to the undecided, dims (day, region, party).
    before_last
        Votes by seat at the election before the last one, as ``last_votes``; None where nobody has them.
    local_sd
        Sd of the local noise between these two elections, log points, dims (party,); it is that of the next
        one too. None where the next election's is drawn with it.
    """

    scenery: Scenery
    last_votes: pd.DataFrame
    baseline: np.ndarray
    weights: np.ndarray
    days: pd.DatetimeIndex
    log_support: np.ndarray
    sigma: np.ndarray
    opinion_days: np.ndarray
    lean_scale: np.ndarray
    undecided_scale: np.ndarray
    lean: np.ndarray
    undecided_lean: np.ndarray
    before_last: pd.DataFrame | None = None
    local_sd: np.ndarray | None = None

    @property
    def last_shares(self) -> np.ndarray:
        """National share of each party as the model's start sees it, dims (party,)."""
        return self.weights @ softmax(self.baseline)

    def day_number(self, day: object) -> int:
        """Position of a date in ``days``."""
        return int((pd.Timestamp(day) - self.days[0]).days)  # type: ignore[arg-type]


def softmax(log_weights: np.ndarray) -> np.ndarray:
    """Shares along the last axis; minus infinity gives zero."""
    weights = np.exp(log_weights - log_weights.max(axis=-1, keepdims=True))
    return weights / weights.sum(axis=-1, keepdims=True)


def log_softmax(log_weights: np.ndarray) -> np.ndarray:
    """Log shares along the last axis; minus infinity stays."""
    top = log_weights.max(axis=-1, keepdims=True)
    return log_weights - top - np.log(np.exp(log_weights - top).sum(axis=-1, keepdims=True))


def draw_country(scenery: Scenery, *, shared_lean: bool, rng: np.random.Generator) -> Country:
    """Draw a last result, the walk of support since then and the lean all houses share."""
    votes, before_last, local_sd = _draw_results(scenery, rng=rng)
    baseline, weights = _baseline(scenery, votes=votes, rng=rng)
    shares = weights @ softmax(baseline)
    usual_sigma = scenery.drift * SIGMA_AT_15_PERCENT * np.sqrt(0.15 / shares)
    sigma = usual_sigma * np.exp(PARTY_NOISE * rng.normal(size=shares.size))
    days = pd.date_range(scenery.last_election, scenery.polling_day, freq="D")
    passed = opinion_days(scenery, days=days)
    log_support = _walk(baseline, weights=weights, sigma=sigma, opinion_days=passed, rng=rng)
    lean_scale = LEAN_SCALE / np.sqrt(shares)
    lean = draw_shared_lean(lean_scale, weights=weights, days=days.size, rng=rng)
    # A generator of its own: what is switched on leaves everything else as it was.
    (undecided_rng,) = rng.spawn(1)
    undecided_scale = scenery.undecided_stray * scenery.undecided * UNDECIDED_STRAY / np.sqrt(shares)
    undecided_lean = draw_shared_lean(undecided_scale, weights=weights, days=days.size, rng=undecided_rng)
    if not shared_lean:
        lean, undecided_lean = np.zeros_like(lean), np.zeros_like(lean)
    return Country(
        scenery=scenery,
        last_votes=votes,
        baseline=baseline,
        weights=weights,
        days=days,
        log_support=still_after_voting(log_support, scenery=scenery, days=days),
        sigma=sigma,
        opinion_days=passed,
        lean_scale=lean_scale,
        undecided_scale=undecided_scale,
        lean=lean + undecided_lean,
        undecided_lean=undecided_lean,
        before_last=before_last,
        local_sd=local_sd,
    )


def _draw_results(
    scenery: Scenery, *, rng: np.random.Generator
) -> tuple[pd.DataFrame, pd.DataFrame | None, np.ndarray | None]:
    """Last result; where the one before is at hand, that one and the local noise between them."""
    votes = draw_last_votes(scenery, rng=rng)
    if scenery.since_before_last is None:
        return votes, None, None
    (next_rng,) = rng.spawn(1)
    local_sd = draw_local_sd(len(scenery.codes), log_sd=scenery.local_sd_log_sd, rng=next_rng)
    last = draw_next_votes(votes, scenery=scenery, local_sd=local_sd, rng=next_rng)
    return last, as_it_stood(votes, scenery=scenery), local_sd


def draw_last_votes(scenery: Scenery, *, rng: np.random.Generator) -> pd.DataFrame:
    """Votes by seat at the last election; regions stray from the country, seats from their region."""
    old = [p for p in scenery.parties if not p.is_new]
    codes = [p.code for p in old]
    usual = [p.usual_share for p in old]
    regional_spread = [p.regional_spread for p in old]
    seat_spread = [p.seat_spread for p in old]
    standing = scenery.standing()[:, [not p.is_new for p in scenery.parties] + [True]]
    if scenery.dissolved is not None:
        code, share = scenery.dissolved
        codes, usual = [*codes, code], [*usual, share]
        regional_spread, seat_spread = [*regional_spread, 0.25], [*seat_spread, 0.35]
        standing = np.insert(standing, -1, True, axis=1)
    codes, usual = [*codes, OTHERS], [*usual, scenery.others_share]
    regional_spread, seat_spread = [*regional_spread, 0.15], [*seat_spread, 0.25]

    # A party that stands in few regions is as strong there as its national share demands.
    log_usual = np.log(np.array(usual)) - np.log(standing.mean(axis=0))
    national = log_usual + 0.15 * rng.normal(size=len(codes))
    frames = []
    for r, region in enumerate(scenery.regions):
        centre = national + np.array(regional_spread) * rng.normal(size=len(codes))
        centre[~standing[r]] = -np.inf
        names = region.seat_names
        shares = softmax(centre + np.array(seat_spread) * rng.normal(size=(len(names), len(codes))))
        turnout = SEAT_VOTES * np.exp(0.12 * rng.normal() + 0.12 * rng.normal(size=len(names)))
        turnout *= region.voters_per_member * np.array(region.members_by_seat)
        table = pd.DataFrame(np.rint(shares * turnout[:, None]).astype(int), columns=codes)
        table.insert(0, "seat", [f"{region.code}-{k + 1:02d}" for k in range(len(names))])
        table.insert(1, "name", names)
        table.insert(2, "region", region.code)
        frames.append(table)
    return pd.concat(frames, ignore_index=True)


def handed_on(votes: pd.DataFrame, *, scenery: Scenery) -> pd.DataFrame:
    """Votes by party now standing: a dissolved party's go to its heirs, what is left to others.

    Columns become ``scenery.codes``; a new party has none.
    """
    present = votes.reindex(columns=list(scenery.codes), fill_value=0).astype(float)
    if scenery.dissolved is not None:
        code = scenery.dissolved[0]
        free = votes[code].astype(float)
        for party in scenery.parties:
            taken = dict(party.inherits).get(code, 0.0) * votes[code]
            present[party.code] += taken
            free = free - taken
        present[OTHERS] += free
    return present


def _baseline(
    scenery: Scenery, *, votes: pd.DataFrame, rng: np.random.Generator
) -> tuple[np.ndarray, np.ndarray]:
    totals = votes.groupby("region", sort=False).sum(numeric_only=True)
    by_region = handed_on(totals, scenery=scenery).to_numpy()
    weights = by_region.sum(axis=1) / by_region.sum()
    with np.errstate(divide="ignore"):
        baseline = np.log(by_region / by_region.sum(axis=1, keepdims=True))
    for j, party in enumerate(scenery.parties):
        if party.is_new:
            first = np.log(party.usual_share) + NEW_PARTY_SPREAD * rng.normal()
            baseline[:, j] = first + party.regional_spread * rng.normal(size=len(scenery.regions))
    baseline[~scenery.standing()] = -np.inf
    return log_softmax(baseline), weights


def _walk(
    baseline: np.ndarray,
    *,
    weights: np.ndarray,
    sigma: np.ndarray,
    opinion_days: np.ndarray,
    rng: np.random.Generator,
) -> np.ndarray:
    regions, parties = baseline.shape
    steps = opinion_days.size - 1
    daily = sigma / np.sqrt(7)
    pace = np.sqrt(opinion_days[1:, None, None])
    national = np.cumsum(rng.normal(size=(steps, 1, parties)) * daily * pace, axis=0)
    regional = rng.normal(size=(steps, regions, parties)) * daily * REGIONAL_DRIFT_RATIO * pace
    regional = np.cumsum(regional, axis=0)
    regional -= np.einsum("r,trp->tp", weights, regional)[:, None]
    start = np.zeros((1, regions, parties))
    return log_softmax(baseline + np.concatenate([start, national + regional]))


def draw_shared_lean(
    lean_scale: np.ndarray, *, weights: np.ndarray, days: int, rng: np.random.Generator
) -> np.ndarray:
    """Lean of all houses together, log points, dims (day, region, party).

    Its variance is the same on every day; between the two polling days it turns by an angle whose
    cosine is their correlation. A smaller part that never moves is each region's own. What the undecided
    add to it follows the same law: as a part u of all respondents that breaks otherwise by η in log points,
    they move everyone's support by about u η.
    """
    first, second = rng.normal(size=(2, lean_scale.size))
    angle = LEAN_TURN * np.linspace(0, 1, days)[:, None]
    common = lean_scale * (np.cos(angle) * first + np.sin(angle) * second)
    own = REGIONAL_LEAN_RATIO * lean_scale * rng.normal(size=(weights.size, lean_scale.size))
    own -= weights @ own
    return common[:, None, :] + own[None]
