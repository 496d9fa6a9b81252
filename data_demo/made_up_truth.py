"""The truth behind an invented election, as tables: what the polls were trying to say."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from data_demo.made_up_answers import expected_answers
from data_demo.made_up_country import LEAN_TURN, REGIONAL_DRIFT_RATIO, REGIONAL_LEAN_RATIO, Country, softmax
from data_demo.made_up_leans import HouseTruth
from data_demo.made_up_local_noise import CLUSTER_PART
from data_demo.made_up_polls import Register
from data_demo.made_up_result import PollingDay, count_winners
from data_demo.made_up_seat_count import PLACE_COLUMNS, RUN_OFF_COLUMNS, SeatCount, count_chamber


@dataclass(frozen=True)
class Truth:
    """What no poll shows. Shares are in percent, leans and scales in log points.

    Attributes
    ----------
    support
        True support by week, polling day last: date, region (blank: the country, by last turnout), code,
        share. Support is what people would vote, all of them: the undecided as they break in the end.
    polling_day
        region (blank: the country, by turnout on polling day), code, support, votes. Votes differ from
        support by the mean of the local noise in a region's seats.
    seats
        code, seats.
    places
        place (seat, district, or lists), how, code, seats: no row where the most votes win every seat.
    run_offs
        seat, code, first_round, run_off (votes): the first two of each seat that went to a second round.
    transfers
        from, to, rate: percent of a party's voters who moved on to another one in a run-off.
    at_register_end
        True support on the register's last day: region (blank: the country, by turnout on polling day),
        code, support.
    houses
        One row per house, method and code: house, method, mode (its usual one), population, code; effect of
        the house in this era; whole_effect, mode and population included; lean_points: what it prints minus
        what the average of all houses would, at national support on the register's last day; and
        own_lean_points, the same without mode and population.
    design
        house, kappa, rho, usual_sample, polls, design_effect at the usual sample.
    leans
        One row per lean and code: kind (mode, population, asked_together), label (the mode, the population,
        the alliance), code, log_points, and points: what it adds to the figures of the average house at
        national support on the register's last day. A lean of an alliance has one more row, for its total.
    lean
        Shared lean by week: date, code, log_points, and points: what the average house would print minus
        true national support. The log points are the sum of record_log_points (the error of which the
        past has a record), undecided_log_points and houses_log_points (the houses' common mean).
    parties
        code, last_share, sigma (per square root of a week), house_scale, lean_scale, undecided_scale,
        seat_slope, local_sd, turnout_tilt.
    regions
        region, weight_last, weight_polling_day, polling_day, counted (blank: on the night).
    opinion_time
        date, pace (usual days of opinion time since the eve), weeks (of opinion time since the last
        election).
    jolts
        day, name, weeks, code, moved: points that national support moved on the day.
    numbers
        quantity, value: what the country has one of.
    interviews
        Daily interviews behind tracking polls: house, date, asked, code, answers.
    """

    support: pd.DataFrame
    polling_day: pd.DataFrame
    seats: pd.DataFrame
    places: pd.DataFrame
    run_offs: pd.DataFrame
    transfers: pd.DataFrame
    at_register_end: pd.DataFrame
    houses: pd.DataFrame
    design: pd.DataFrame
    leans: pd.DataFrame
    lean: pd.DataFrame
    parties: pd.DataFrame
    regions: pd.DataFrame
    opinion_time: pd.DataFrame
    jolts: pd.DataFrame
    numbers: pd.DataFrame
    interviews: pd.DataFrame

    def tables(self) -> dict[str, pd.DataFrame]:
        """Tables of a contest's ``truth/`` by file name without ending."""
        return {
            "support_over_time": self.support,
            "support_polling_day": self.polling_day,
            "seats_won": self.seats,
            "seats_won_by_place": self.places,
            "run_offs": self.run_offs,
            "run_off_transfers": self.transfers,
            "house_effects": self.houses,
            "house_design_effects": self.design,
            "mode_leans": self.leans,
            "shared_lean": self.lean,
            "party_scales": self.parties,
            "turnout_weights": self.regions,
            "opinion_time": self.opinion_time,
            "jolts": self.jolts,
            "country_numbers": self.numbers,
            "tracking_interviews": self.interviews,
        }


def tell_truth(country: Country, *, houses: HouseTruth, register: Register, result: PollingDay) -> Truth:
    """Gather the truth of one election."""
    counted = _count_seats(country, result=result)
    return Truth(
        support=_support_table(country),
        polling_day=_polling_day_table(country, result=result),
        seats=counted.seats.reset_index(),
        places=counted.places,
        run_offs=counted.run_offs,
        transfers=result.transfers,
        at_register_end=_register_end_table(country, result=result),
        houses=_house_table(country, houses=houses),
        design=_design_table(country, houses=houses, polls=register.polls),
        leans=_leans_table(country, houses=houses),
        lean=_shared_lean_table(country, houses=houses),
        parties=_party_table(country, houses=houses, result=result),
        regions=_region_table(country, result=result),
        opinion_time=pd.DataFrame(
            {
                "date": country.days.strftime("%Y-%m-%d"),
                "pace": country.opinion_days,
                "weeks": country.opinion_days.cumsum() / 7,
            }
        ),
        jolts=_jolt_table(country),
        numbers=_number_table(country, elected=int(counted.seats.sum())),
        interviews=register.interviews,
    )


def _count_seats(country: Country, *, result: PollingDay) -> SeatCount:
    scenery = country.scenery
    if scenery.counting is not None:
        return count_chamber(result.votes, scenery=scenery, transfers=result.transfers)
    return SeatCount(
        seats=count_winners(result.votes, codes=scenery.codes),
        places=pd.DataFrame(columns=PLACE_COLUMNS),
        run_offs=pd.DataFrame(columns=RUN_OFF_COLUMNS),
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


def _register_end_table(country: Country, *, result: PollingDay) -> pd.DataFrame:
    support = np.exp(country.log_support[country.day_number(country.scenery.register_end)])
    shares = np.vstack([result.turnout_weights @ support, support])
    index = pd.MultiIndex.from_product(
        [["", *country.scenery.region_codes], country.scenery.codes], names=["region", "code"]
    )
    return pd.DataFrame({"support": 100 * shares.ravel()}, index=index).reset_index()


def _printed_at_the_end(country: Country, *, effect: np.ndarray) -> np.ndarray:
    """National figures of a house at support on the register's last day, dims (party,)."""
    log_support = country.log_support[country.day_number(country.scenery.register_end)]
    return np.asarray(country.weights @ softmax(log_support + effect))


def _house_table(country: Country, *, houses: HouseTruth) -> pd.DataFrame:
    average = _printed_at_the_end(country, effect=houses.effect.mean(axis=0))
    frames = []
    for position, house in enumerate(country.scenery.houses):
        for era, method in enumerate(house.methods):
            mode = house.main_mode(era)
            own = houses.own_effect(position, era=era)
            whole = houses.whole_effect(position, era=era, mode=mode, population=house.population)
            frames.append(
                pd.DataFrame(
                    {
                        "house": house.name,
                        "method": method,
                        "mode": mode,
                        "population": house.population,
                        "code": country.scenery.codes,
                        "effect": own,
                        "whole_effect": whole,
                        "lean_points": 100 * (_printed_at_the_end(country, effect=whole) - average),
                        "own_lean_points": 100 * (_printed_at_the_end(country, effect=own) - average),
                    }
                )
            )
    return pd.concat(frames, ignore_index=True)


def _leans_table(country: Country, *, houses: HouseTruth) -> pd.DataFrame:
    common = houses.effect.mean(axis=0)
    average = _printed_at_the_end(country, effect=common)
    members = {a.code: [country.scenery.codes.index(m) for m in a.members] for a in country.scenery.alliances}
    kinds = {
        "mode": houses.mode_lean,
        "population": houses.population_lean,
        "asked_together": houses.formation_lean,
    }
    rows = []
    for kind, leans in kinds.items():
        for label, lean in leans.items():
            points = 100 * (_printed_at_the_end(country, effect=common + lean) - average)
            for code, log_points, added in zip(country.scenery.codes, lean, points, strict=True):
                rows.append((kind, label, code, log_points, added))
            if label in members:
                rows.append((kind, label, label, np.nan, points[members[label]].sum()))
    return pd.DataFrame(rows, columns=["kind", "label", "code", "log_points", "points"])


def _design_table(country: Country, *, houses: HouseTruth, polls: pd.DataFrame) -> pd.DataFrame:
    scenery = country.scenery
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


def _shared_lean_table(country: Country, *, houses: HouseTruth) -> pd.DataFrame:
    weeks = _weekly(country)
    mean_effect = houses.effect.mean(axis=0)
    undecided = np.einsum("r,trp->tp", country.weights, country.undecided_lean[weeks])
    common = np.einsum("r,trp->tp", country.weights, country.lean[weeks])
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
        {
            "log_points": (common + mean_effect).ravel(),
            "points": 100 * (printed - true).ravel(),
            "record_log_points": (common - undecided).ravel(),
            "undecided_log_points": undecided.ravel(),
            "houses_log_points": np.broadcast_to(mean_effect, common.shape).ravel(),
        },
        index=index,
    ).reset_index()


def _party_table(country: Country, *, houses: HouseTruth, result: PollingDay) -> pd.DataFrame:
    return pd.DataFrame(
        {
            "code": country.scenery.codes,
            "last_share": 100 * country.last_shares,
            "sigma": country.sigma,
            "house_scale": houses.effect_scale,
            "lean_scale": country.lean_scale,
            "undecided_scale": country.undecided_scale,
            "seat_slope": result.slope,
            "local_sd": result.local_sd,
            "turnout_tilt": result.turnout_tilt,
        }
    )


def _region_table(country: Country, *, result: PollingDay) -> pd.DataFrame:
    scenery = country.scenery
    return pd.DataFrame(
        {
            "region": scenery.region_codes,
            "weight_last": country.weights,
            "weight_polling_day": result.turnout_weights,
            "polling_day": [str(r.polling_day or scenery.polling_day) for r in scenery.regions],
            "counted": [str(r.counted or "") for r in scenery.regions],
        }
    )


def _jolt_table(country: Country) -> pd.DataFrame:
    frames = []
    for jolt in country.scenery.jolts:
        day = country.day_number(jolt.day)
        before, after = (country.weights @ np.exp(country.log_support[d]) for d in (day - 1, day))
        frames.append(
            pd.DataFrame(
                {
                    "day": str(jolt.day),
                    "name": jolt.name,
                    "weeks": jolt.weeks,
                    "code": country.scenery.codes,
                    "moved": 100 * (after - before),
                }
            )
        )
    columns = ["day", "name", "weeks", "code", "moved"]
    return pd.concat(frames, ignore_index=True) if frames else pd.DataFrame(columns=columns)


def _number_table(country: Country, *, elected: int) -> pd.DataFrame:
    scenery = country.scenery
    numbers = {
        "log height of the ramp of opinion time": scenery.ramp_log_height,
        "regional drift over the national": REGIONAL_DRIFT_RATIO,
        "regional part of the shared lean over the national": REGIONAL_LEAN_RATIO,
        "correlation of the shared lean between the two elections": np.cos(LEAN_TURN),
        "usual part of undecided, percent": 100 * scenery.undecided,
    }
    if any(region.clusters for region in scenery.regions):
        numbers["part of a seat's local noise that its cluster shares"] = CLUSTER_PART
    if scenery.counting is not None:
        numbers["seats of the chamber"] = scenery.seat_count
        numbers["seats of the chamber that was elected"] = elected
    return pd.DataFrame({"quantity": list(numbers), "value": list(numbers.values())})
