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

from data_demo.made_up_country import Country, draw_country, softmax
from data_demo.made_up_polls import HouseTruth, draw_house_truth, draw_polls, expected_answers
from data_demo.made_up_result import PollingDay, count_winners, draw_polling_day
from data_demo.made_up_scenery import SMALL_ELECTION, ElectionSize, Scenery, draw_scenery

__all__ = [
    "SMALL_ELECTION",
    "ElectionSize",
    "MadeUpElection",
    "Truth",
    "simulate_election",
    "simulate_scenery",
]


@dataclass(frozen=True)
class Truth:
    """What no poll shows. Shares are in percent, leans and scales in log points.

    Attributes
    ----------
    support
        True support by week, polling day last: date, region (blank: the country, by last turnout), code,
        share.
    polling_day
        region (blank: the country, by turnout on polling day), code, support, votes. Votes differ from
        support by the mean of the local noise in a region's seats.
    seats
        code, seats.
    houses
        house, code, effect, lean_points: what the house prints minus what the average of all houses
        would, at national support on the register's last day.
    design
        house, kappa, rho, usual_sample, polls, design_effect at the usual sample.
    lean
        Shared lean by week: date, code, log_points, and points: what the average house would print minus
        true national support (shared lean, regional leans and the houses' common mean together).
    parties
        code, last_share, sigma (per square root of a week), house_scale, lean_scale, seat_slope,
        local_sd.
    regions
        region, weight_last, weight_polling_day.
    """

    support: pd.DataFrame
    polling_day: pd.DataFrame
    seats: pd.DataFrame
    houses: pd.DataFrame
    design: pd.DataFrame
    lean: pd.DataFrame
    parties: pd.DataFrame
    regions: pd.DataFrame

    def tables(self) -> dict[str, pd.DataFrame]:
        """Every table by its file name without ending."""
        return {
            "support_over_time": self.support,
            "support_polling_day": self.polling_day,
            "seats_won": self.seats,
            "house_effects": self.houses,
            "house_design_effects": self.design,
            "shared_lean": self.lean,
            "party_scales": self.parties,
            "turnout_weights": self.regions,
        }


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
    """

    seed: int
    scenery: Scenery
    polls: pd.DataFrame
    result_last: pd.DataFrame
    outcome: pd.DataFrame
    truth: Truth


def simulate_election(
    seed: int, *, size: ElectionSize | None = None, shared_lean: bool = True
) -> MadeUpElection:
    """Simulate a nameless election; everything is drawn anew from the seed.

    Parameters
    ----------
    size
        How large it is; by default seven parties, eight regions, 200 seats and 250 polls.
    shared_lean
        Whether all houses share a lean (regional leans included). House effects are drawn either way.

    Raises
    ------
    ValueError
        Where a size cannot be built, or has more polls than its houses' calendars have room for.
    """
    scenery = draw_scenery(size or ElectionSize(), rng=np.random.default_rng([seed, 0]))
    return simulate_scenery(scenery, seed=seed, shared_lean=shared_lean)


def simulate_scenery(scenery: Scenery, *, seed: int, shared_lean: bool = True) -> MadeUpElection:
    """Simulate an election whose calendar, parties, regions and houses are given."""
    # One stream per subject: another register leaves the country and its result as they were.
    country_rng, house_rng, poll_rng, result_rng = (np.random.default_rng([seed, k]) for k in range(1, 5))
    country = draw_country(scenery, shared_lean=shared_lean, rng=country_rng)
    houses = draw_house_truth(country, rng=house_rng)
    polls = draw_polls(country, houses=houses, rng=poll_rng)
    result = draw_polling_day(country, rng=result_rng)
    return MadeUpElection(
        seed=seed,
        scenery=scenery,
        polls=polls,
        result_last=country.last_votes,
        outcome=result.votes,
        truth=_truth(country, houses=houses, polls=polls, result=result),
    )


def _truth(country: Country, *, houses: HouseTruth, polls: pd.DataFrame, result: PollingDay) -> Truth:
    scenery = country.scenery
    seats = count_winners(result.votes, codes=scenery.codes)
    return Truth(
        support=_support_table(country),
        polling_day=_polling_day_table(country, result=result),
        seats=seats.reset_index(),
        houses=_house_table(country, houses=houses),
        design=_design_table(scenery, houses=houses, polls=polls),
        lean=_lean_table(country, houses=houses),
        parties=pd.DataFrame(
            {
                "code": scenery.codes,
                "last_share": 100 * country.last_shares,
                "sigma": country.sigma,
                "house_scale": houses.effect_scale,
                "lean_scale": country.lean_scale,
                "seat_slope": result.slope,
                "local_sd": result.local_sd,
            }
        ),
        regions=pd.DataFrame(
            {
                "region": scenery.region_codes,
                "weight_last": country.weights,
                "weight_polling_day": result.turnout_weights,
            }
        ),
    )


def _weekly(country: Country) -> np.ndarray:
    """Every seventh day, counted back from polling day."""
    return np.arange(country.days.size - 1, -1, -7)[::-1]


def _support_table(country: Country) -> pd.DataFrame:
    codes, regions = country.scenery.codes, ("", *country.scenery.region_codes)
    weeks = _weekly(country)
    by_region = np.exp(country.log_support[weeks])
    national = np.einsum("r,trp->tp", country.weights, by_region)[:, None]
    shares = 100 * np.concatenate([national, by_region], axis=1)
    index = pd.MultiIndex.from_product(
        [country.days[weeks].strftime("%Y-%m-%d"), regions, codes], names=["date", "region", "code"]
    )
    return pd.DataFrame({"share": shares.ravel()}, index=index).reset_index()


def _polling_day_table(country: Country, *, result: PollingDay) -> pd.DataFrame:
    codes, regions = list(country.scenery.codes), list(country.scenery.region_codes)
    support = np.exp(country.log_support[-1])
    support = np.vstack([result.turnout_weights @ support, support])
    by_region = result.votes.groupby("region", sort=False)[codes].sum().loc[regions]
    votes = np.vstack([by_region.sum().to_numpy(), by_region.to_numpy()]).astype(float)
    votes /= votes.sum(axis=1, keepdims=True)
    index = pd.MultiIndex.from_product([["", *regions], codes], names=["region", "code"])
    table = pd.DataFrame({"support": 100 * support.ravel(), "votes": 100 * votes.ravel()}, index=index)
    return table.reset_index()


def _house_table(country: Country, *, houses: HouseTruth) -> pd.DataFrame:
    log_support = country.log_support[country.day_number(country.scenery.register_end)]
    average = country.weights @ softmax(log_support + houses.effect.mean(axis=0))
    lean = np.array([country.weights @ softmax(log_support + effect) - average for effect in houses.effect])
    index = pd.MultiIndex.from_product(
        [[h.name for h in country.scenery.houses], country.scenery.codes], names=["house", "code"]
    )
    table = pd.DataFrame({"effect": houses.effect.ravel(), "lean_points": 100 * lean.ravel()}, index=index)
    return table.reset_index()


def _design_table(scenery: Scenery, *, houses: HouseTruth, polls: pd.DataFrame) -> pd.DataFrame:
    usual = np.array([h.usual_sample for h in scenery.houses])
    counts = polls.groupby("house")["poll"].nunique()
    return pd.DataFrame(
        {
            "house": [h.name for h in scenery.houses],
            "kappa": houses.kappa,
            "rho": houses.rho,
            "usual_sample": usual,
            "polls": [int(counts[h.name]) for h in scenery.houses],
            "design_effect": houses.kappa + (usual - 1) * houses.rho,
        }
    )


def _lean_table(country: Country, *, houses: HouseTruth) -> pd.DataFrame:
    weeks = _weekly(country)
    common = np.einsum("r,trp->tp", country.weights, country.lean[weeks]) + houses.effect.mean(axis=0)
    mean_effect = houses.effect.mean(axis=0)
    printed = np.array(
        [
            country.weights @ expected_answers(country, effect=mean_effect, first_day=day, last_day=day)
            for day in weeks
        ]
    )
    true = np.einsum("r,trp->tp", country.weights, np.exp(country.log_support[weeks]))
    index = pd.MultiIndex.from_product(
        [country.days[weeks].strftime("%Y-%m-%d"), country.scenery.codes], names=["date", "code"]
    )
    return pd.DataFrame(
        {"log_points": common.ravel(), "points": 100 * (printed - true).ravel()}, index=index
    ).reset_index()
