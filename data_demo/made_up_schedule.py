"""Who is in the field when: the calendar of an invented poll register."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from data_demo.made_up_country import Country

LONGEST_WINDOW = 6
SLOWEST_PUBLICATION = 4


@dataclass(frozen=True)
class Visit:
    """One poll before its answers: which house, on which days, by which method.

    Attributes
    ----------
    house
        Position in the scenery.
    start, end, published
        Positions in the country's days.
    era
        Position in the house's methods.
    mode
        Mode of its interviews.
    """

    house: int
    start: int
    end: int
    published: int
    era: int = 0
    mode: str = ""


def draw_schedule(country: Country, *, rng: np.random.Generator) -> list[Visit]:
    """Fieldwork windows; no house is in the field twice at a time, more are towards the end.

    Raises
    ------
    ValueError
        Where a house's calendar has no room for its polls.
    """
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
        tracker = scenery.houses[house].tracker
        if tracker is not None:
            free[country.day_number(tracker.first_day) :] = False
        for _ in range(count):
            visits.append(_place(house, free=free, possible=possible, density=density, rng=rng))
    register_end = last + 1
    placed = sorted(
        (replace(v, published=min(v.published, register_end)) for v in visits),
        key=lambda v: (v.house, v.end),
    )
    (mode_rng,) = rng.spawn(1)
    return [_with_method(visit, country=country, rng=mode_rng) for visit in placed]


def _place(
    house: int, *, free: np.ndarray, possible: np.ndarray, density: np.ndarray, rng: np.random.Generator
) -> Visit:
    for _ in range(1000):
        end = int(rng.choice(possible, p=density / density.sum()))
        start = end - int(rng.integers(1, LONGEST_WINDOW + 1)) + 1
        if start >= possible[0] and free[start : end + 1].all():
            free[start : end + 1] = False
            return Visit(house, start, end, end + int(rng.integers(1, SLOWEST_PUBLICATION + 1)))
    raise ValueError("Too many polls for a house's calendar: ask for fewer polls or more houses.")


def _with_method(visit: Visit, *, country: Country, rng: np.random.Generator) -> Visit:
    house = country.scenery.houses[visit.house]
    era = house.era_on(country.days[visit.start].date())
    mode = house.main_mode(era)
    if house.second_mode is not None and rng.random() < house.second_mode_part:
        mode = house.second_mode
    return replace(visit, era=era, mode=mode)


def mode_shares(schedule: list[Visit]) -> dict[str, float]:
    """Part of the houses that use each mode; a house with several counts for each by its share of polls."""
    shares: dict[str, float] = {mode: 0.0 for mode in sorted({v.mode for v in schedule})}
    houses = {v.house for v in schedule}
    for house in houses:
        modes = [v.mode for v in schedule if v.house == house]
        for mode in modes:
            shares[mode] += 1 / len(modes) / len(houses)
    return shares
