"""The poll register of an invented election: who is asked, what they answer, and what is printed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from data_demo.made_up_answers import draw_answers, expected_answers, group_codes, print_cells
from data_demo.made_up_country import Country
from data_demo.made_up_leans import HouseTruth
from data_demo.made_up_scenery import OTHERS, MadeUpHouse
from data_demo.made_up_schedule import Visit
from data_demo.made_up_tracker import draw_interviews, window_rows

EACH_REGION = "each"
FIXED_COLUMNS = (
    *("poll", "house", "sponsor", "start", "end", "published", "question", "region", "sample"),
    *("effective", "mode", "population", "method"),
)
LAST_COLUMNS = ("undecided", "status", "status_date", "replaces", "use", "why_not", "source", "note")


@dataclass(frozen=True)
class Register:
    """What the houses publish, and the interviews behind their tracking polls.

    Attributes
    ----------
    polls
        One row per poll or per poll and region, in order of publication; columns as in ``polls.csv``.
    interviews
        One row per tracking house, day and code: house, date, asked (interviews of the day), code, answers.
    """

    polls: pd.DataFrame
    interviews: pd.DataFrame


def draw_polls(
    country: Country, *, houses: HouseTruth, schedule: list[Visit], rng: np.random.Generator
) -> Register:
    """Draw the whole register."""
    scenery = country.scenery
    numbers = [0] * len(scenery.houses)
    rows: list[dict[str, object]] = []
    for visit in schedule:
        numbers[visit.house] += 1
        name = f"{scenery.houses[visit.house].label}-{numbers[visit.house]:03d}"
        rows += _draw_poll(country, houses=houses, visit=visit, name=name, rng=rng)
    (tracker_rng,) = rng.spawn(1)
    interviews = []
    for position, house in enumerate(scenery.houses):
        if house.tracker is not None:
            daily = draw_interviews(country, houses=houses, house=position, rng=tracker_rng)
            interviews.append(daily)
            rows += window_rows(daily, house=house, kappa=houses.kappa[position])
    codes = [*scenery.codes[:-1], *(a.code for a in scenery.alliances), OTHERS]
    table = pd.DataFrame(rows, columns=[*FIXED_COLUMNS, *codes, *LAST_COLUMNS])
    table = table.sort_values(["published", "poll"], kind="stable", ignore_index=True)
    nothing = pd.DataFrame(columns=["house", "date", "asked", "code", "answers"])
    return Register(table, pd.concat(interviews, ignore_index=True) if interviews else nothing)


def _draw_poll(
    country: Country, *, houses: HouseTruth, visit: Visit, name: str, rng: np.random.Generator
) -> list[dict[str, object]]:
    scenery = country.scenery
    house = scenery.houses[visit.house]
    last_day = country.days[visit.end].date()
    unvoted = scenery.regions_voting_after(last_day)
    where, sample = _draw_regions(house, regions=unvoted, rng=rng)
    samples = rng.multinomial(sample, country.weights) if where == EACH_REGION else np.array([sample])
    rate = 0.0 if house.undecided is None else house.undecided / 100 * np.exp(0.15 * rng.normal())
    decided = samples - rng.binomial(samples, rate)
    groups = group_codes(scenery, house=house, day=country.days[visit.start].date(), rng=rng)
    head = _head(country, house=house, visit=visit, name=name, rng=rng)
    deff = houses.design_effect(visit.house, respondents=float(decided.sum()))
    effect = houses.whole_effect(
        visit.house,
        era=visit.era,
        mode=visit.mode,
        population=house.population,
        together=[a.code for a in scenery.alliances if a.code in groups],
    )
    answers = expected_answers(country, effect=effect, first_day=visit.start, last_day=visit.end)
    kappa = houses.kappa[visit.house]
    regions = scenery.region_codes if where == EACH_REGION else (where,)
    rows, whole = [], pd.Series(0, index=list(groups))
    for region, asked, count in zip(regions, samples, decided, strict=True):
        expected = country.weights @ answers if region == "" else answers[scenery.region_codes.index(region)]
        cells = draw_answers(expected, groups=groups, respondents=int(count), deff=deff, rng=rng)
        whole = whole.add(pd.Series(cells), fill_value=0)
        printed = print_cells(cells, house=house, sample=int(asked), decided=int(count), kappa=kappa)
        rows.append({**head, "region": region, "sample": int(asked), **printed})
    if where == EACH_REGION:
        cells = {code: int(whole[code]) for code in groups}
        printed = print_cells(cells, house=house, sample=sample, decided=int(decided.sum()), kappa=kappa)
        # Nobody prints how a region will vote that has voted.
        shown = [r for r in (house.breakdown_regions or scenery.region_codes) if r in unvoted]
        rows = [row for row in rows if row["region"] in shown]
        rows.insert(0, {**head, "region": "", "sample": sample, **printed})
    return rows


def _draw_regions(
    house: MadeUpHouse, *, regions: tuple[str, ...], rng: np.random.Generator
) -> tuple[str, int]:
    """Region code, "" for the country, or EACH_REGION; and the whole poll's sample."""
    sample = house.usual_sample * np.exp(0.12 * rng.normal())
    kind = rng.random()
    if kind < house.regional:
        return str(rng.choice(regions)), int(max(sample * 0.45, 300))
    if kind < house.regional + (1 - house.regional) * house.breakdown:
        return EACH_REGION, int(sample)
    return "", int(sample)


def _head(
    country: Country, *, house: MadeUpHouse, visit: Visit, name: str, rng: np.random.Generator
) -> dict[str, object]:
    days = country.days.strftime("%Y-%m-%d")
    published = str(days[visit.published])
    head: dict[str, object] = {
        "poll": name,
        "house": house.name,
        "sponsor": str(rng.choice(house.sponsors)),
        "start": str(days[visit.start]),
        "end": str(days[visit.end]),
        "published": published,
        "question": "vote",
        "mode": visit.mode,
        "population": house.population,
        "status": "final",
        "source": f"release {published}",
    }
    method = house.methods[visit.era]
    return head | ({"method": method} if method else {})
