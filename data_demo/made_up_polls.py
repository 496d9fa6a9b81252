"""The poll register of an invented election: who asks whom, when, and what they print."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from data_demo.made_up_country import Country, softmax
from data_demo.made_up_scenery import OTHERS, MadeUpHouse, Scenery

TAU_AT_15_PERCENT = 0.06
"""Log sd between houses for a party of 15 %."""
TAU_NOISE = 0.3
EACH_REGION = "each"
LONGEST_WINDOW = 6
SLOWEST_PUBLICATION = 4
FIXED_COLUMNS = (
    *("poll", "house", "sponsor", "start", "end", "published", "question", "region", "sample"),
    *("effective", "mode", "population", "method"),
)
LAST_COLUMNS = ("undecided", "status", "status_date", "replaces", "use", "why_not", "source", "note")


@dataclass(frozen=True)
class HouseTruth:
    """What is true of the houses and no poll prints.

    Attributes
    ----------
    effect
        House effects, log points, dims (house, party), drawn independently: their mean is part of what
        all polls share.
    effect_scale
        Sd the effects were drawn with, dims (party,).
    kappa, rho
        Design effect at size N is kappa + (N - 1) rho, dims (house,).
    """

    effect: np.ndarray
    effect_scale: np.ndarray
    kappa: np.ndarray
    rho: np.ndarray

    def design_effect(self, house: int, *, respondents: float) -> float:
        """Design effect of one house at one size of the whole poll."""
        return float(self.kappa[house] + (respondents - 1) * self.rho[house])


@dataclass(frozen=True)
class _Visit:
    """One poll before its answers: who, when, where, how many decided respondents."""

    house: int
    start: int
    end: int
    published: int


def draw_house_truth(country: Country, *, rng: np.random.Generator) -> HouseTruth:
    """Draw house effects and design effects."""
    houses, shares = len(country.scenery.houses), country.last_shares
    scale = TAU_AT_15_PERCENT * np.sqrt(0.15 / shares) * np.exp(TAU_NOISE * rng.normal(size=shares.size))
    kappa_centre, rho_centre = rng.normal(np.log(0.4), 0.4), rng.normal(np.log(0.0004), 0.7)
    return HouseTruth(
        effect=scale * rng.normal(size=(houses, shares.size)),
        effect_scale=scale,
        kappa=1 + np.exp(kappa_centre + 0.4 * rng.normal(size=houses)),
        rho=np.exp(rho_centre + 0.5 * rng.normal(size=houses)),
    )


def draw_polls(country: Country, *, houses: HouseTruth, rng: np.random.Generator) -> pd.DataFrame:
    """Draw the whole register, one row per poll or per poll and region, in order of publication."""
    scenery = country.scenery
    visits = _draw_visits(country, rng=rng)
    numbers = [0] * len(scenery.houses)
    rows: list[dict[str, object]] = []
    for visit in visits:
        numbers[visit.house] += 1
        house = scenery.houses[visit.house]
        name = f"{house.label}-{numbers[visit.house]:03d}"
        rows += _draw_poll(country, houses=houses, visit=visit, name=name, rng=rng)
    codes = [*scenery.codes[:-1], *(a.code for a in scenery.alliances), OTHERS]
    table = pd.DataFrame(rows, columns=[*FIXED_COLUMNS, *codes, *LAST_COLUMNS])
    return table.sort_values(["published", "poll"], kind="stable", ignore_index=True)


def _draw_visits(country: Country, *, rng: np.random.Generator) -> list[_Visit]:
    """Fieldwork windows; no house is in the field twice at a time, more are towards the end."""
    scenery = country.scenery
    first = country.day_number(scenery.first_fieldwork)
    last = country.day_number(scenery.register_end) - 1
    possible = np.arange(first, last + 1)
    density = 1 + 2 * np.exp(-(last - possible) / 60)
    activity = np.array([h.activity for h in scenery.houses])
    counts = 1 + rng.multinomial(scenery.polls - activity.size, activity / activity.sum())
    visits = []
    for house, count in enumerate(counts):
        free = np.ones(last + 1, dtype=bool)
        for _ in range(count):
            visits.append(_place(house, free=free, possible=possible, density=density, rng=rng))
    register_end = last + 1
    return sorted(
        (_Visit(v.house, v.start, v.end, min(v.published, register_end)) for v in visits),
        key=lambda v: (v.house, v.end),
    )


def _place(
    house: int, *, free: np.ndarray, possible: np.ndarray, density: np.ndarray, rng: np.random.Generator
) -> _Visit:
    for _ in range(1000):
        end = int(rng.choice(possible, p=density / density.sum()))
        start = end - int(rng.integers(1, LONGEST_WINDOW + 1)) + 1
        if start >= possible[0] and free[start : end + 1].all():
            free[start : end + 1] = False
            return _Visit(house, start, end, end + int(rng.integers(1, SLOWEST_PUBLICATION + 1)))
    raise ValueError("Too many polls for a house's calendar: ask for fewer polls or more houses.")


def _draw_poll(
    country: Country, *, houses: HouseTruth, visit: _Visit, name: str, rng: np.random.Generator
) -> list[dict[str, object]]:
    scenery = country.scenery
    house = scenery.houses[visit.house]
    where, sample = _draw_regions(scenery, house=house, rng=rng)
    samples = rng.multinomial(sample, country.weights) if where == EACH_REGION else np.array([sample])
    rate = 0.0 if house.undecided is None else house.undecided / 100 * np.exp(0.15 * rng.normal())
    decided = samples - rng.binomial(samples, rate)
    groups = _groups(country, house=house, visit=visit, rng=rng)
    head = _head(country, house=house, visit=visit, name=name, rng=rng)
    deff = houses.design_effect(visit.house, respondents=float(decided.sum()))
    answers = expected_answers(
        country, effect=houses.effect[visit.house], first_day=visit.start, last_day=visit.end
    )
    regions = scenery.region_codes if where == EACH_REGION else (where,)
    rows, whole = [], pd.Series(0, index=list(groups))
    for region, asked, count in zip(regions, samples, decided, strict=True):
        expected = country.weights @ answers if region == "" else answers[scenery.region_codes.index(region)]
        cells = draw_answers(expected, groups=groups, respondents=int(count), deff=deff, rng=rng)
        whole = whole.add(pd.Series(cells), fill_value=0)
        printed = _print_cells(cells, house=house, sample=int(asked), decided=int(count))
        rows.append({**head, "region": region, "sample": int(asked), **printed})
    if where == EACH_REGION:
        cells = {code: int(whole[code]) for code in groups}
        printed = _print_cells(cells, house=house, sample=sample, decided=int(decided.sum()))
        rows.insert(0, {**head, "region": "", "sample": sample, **printed})
    return rows


def expected_answers(country: Country, *, effect: np.ndarray, first_day: int, last_day: int) -> np.ndarray:
    """Mean answer of a house over a window, dims (region, party): support, shared lean, house effect."""
    window = slice(first_day, last_day + 1)
    return softmax(country.log_support[window] + country.lean[window] + effect).mean(axis=0)


def _draw_regions(scenery: Scenery, *, house: MadeUpHouse, rng: np.random.Generator) -> tuple[str, int]:
    """Region code, "" for the country, or EACH_REGION; and the whole poll's sample."""
    sample = house.usual_sample * np.exp(0.12 * rng.normal())
    kind = rng.random()
    if kind < house.regional:
        return str(rng.choice(scenery.region_codes)), int(max(sample * 0.45, 300))
    if kind < house.regional + (1 - house.regional) * house.breakdown:
        return EACH_REGION, int(sample)
    return "", int(sample)


def _groups(
    country: Country, *, house: MadeUpHouse, visit: _Visit, rng: np.random.Generator
) -> dict[str, list[int]]:
    """Settle what the house offers: printed code to the positions of the parties in it."""
    scenery = country.scenery
    day = country.days[visit.start].date()
    groups = {code: [j] for j, code in enumerate(scenery.codes)}
    for alliance in scenery.alliances:
        exists = alliance.from_ is None or alliance.from_ <= day
        if alliance.code in house.pools and exists and rng.random() < 0.6:
            groups[alliance.code] = [groups.pop(member)[0] for member in alliance.members]
    for code in house.lumps:
        if code in groups and rng.random() < 0.8:
            groups[OTHERS] += groups.pop(code)
    return groups


def _head(
    country: Country, *, house: MadeUpHouse, visit: _Visit, name: str, rng: np.random.Generator
) -> dict[str, object]:
    days = country.days.strftime("%Y-%m-%d")
    published = str(days[visit.published])
    return {
        "poll": name,
        "house": house.name,
        "sponsor": str(rng.choice(house.sponsors)),
        "start": str(days[visit.start]),
        "end": str(days[visit.end]),
        "published": published,
        "question": "vote",
        "mode": house.mode,
        "population": house.population,
        "status": "final",
        "source": f"release {published}",
    }


def draw_answers(
    expected: np.ndarray,
    *,
    groups: dict[str, list[int]],
    respondents: int,
    deff: float,
    rng: np.random.Generator,
) -> dict[str, int]:
    """Dirichlet-multinomial counts whose variance is ``deff`` times a simple random sample's."""
    offered = {code: float(expected[members].sum()) for code, members in groups.items()}
    offered = {code: share for code, share in offered.items() if share > 0}
    if respondents <= deff:
        raise ValueError(f"A row of {respondents} respondents cannot bear a design effect of {deff:.1f}.")
    precision = (respondents - deff) / (deff - 1)
    shares = rng.dirichlet(precision * np.array(list(offered.values())))
    return dict(zip(offered, rng.multinomial(respondents, shares).tolist(), strict=True))


def _print_cells(
    cells: dict[str, int], *, house: MadeUpHouse, sample: int, decided: int
) -> dict[str, object]:
    """Percentages as the house prints them: of everyone where it publishes the undecided."""
    base = decided if house.undecided is None else sample
    printed: dict[str, object] = {
        code: _rounded(100 * count / base, grid=house.grid)
        for code, count in cells.items()
        if code != OTHERS or house.lists_others
    }
    if house.undecided is not None:
        printed["undecided"] = _rounded(100 * (sample - decided) / sample, grid=house.grid)
    return printed


def _rounded(percent: float, *, grid: float) -> float:
    return round(float(np.floor(percent / grid + 0.5)) * grid, 1)
