"""A nameless election of some size: its parties, regions, houses and how untidy all of it is."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date, timedelta

import numpy as np

from data_demo.made_up_scenery import (
    MadeUpAlliance,
    MadeUpHouse,
    MadeUpJolt,
    MadeUpParty,
    MadeUpRegion,
    MadeUpTracker,
    MethodChange,
    Scenery,
)
from data_demo.made_up_time import RAMP_LOG_SD


@dataclass(frozen=True)
class ElectionSize:
    """How large a nameless election is.

    Attributes
    ----------
    parties
        Parties besides others. The last two of them become the regional and the new party where those
        are asked for, so that four plain parties are ``parties=4, regional_party=False, new_party=False``.
    weeks, polled_weeks
        Weeks from the last election to polling day, and how many of the last of them see polls.
    silent_days
        Days from the last publication of a poll to polling day.
    drift
        Factor on the usual speed of opinion: below one for a calmer country.
    special_rows
        Whether houses lump small parties, pool alliances, ask in one region, break down by region and
        publish undecided; without them each poll is national and lists every party.
    ramp
        Whether opinion moves faster or slower towards polling day.
    jolts
        Number of days on which opinion jumps.
    method_changes
        Whether every third house changes its method once.
    mode_leans, population_leans, formation_leans
        Whether the mode (some houses then use two), a population other than voters (some houses then ask
        one), and asking about an alliance as one make figures differ.
    undecided_stray
        Whether the undecided may break otherwise than the decided; some houses then publish undecided.
    phases
        Whether the last region votes two weeks early and is counted some days later.
    tracker
        Whether the last house runs a tracking poll in the last weeks.
    effective_sizes
        Whether every fourth house publishes effective sample sizes.
    part_breakdowns
        Whether every fourth house breaks some polls down by the first half of the regions only.
    turnout_tilt
        Whether turnout goes with support.
    past_elections
        Number of elections in the record of past errors.
    """

    parties: int = 7
    regions: int = 8
    seats: int = 200
    houses: int = 9
    polls: int = 250
    weeks: int = 209
    polled_weeks: int = 78
    silent_days: int = 8
    drift: float = 1.0
    regional_party: bool = True
    new_party: bool = True
    dissolved_party: bool = True
    alliances: bool = True
    special_rows: bool = True
    ramp: bool = False
    jolts: int = 0
    method_changes: bool = False
    mode_leans: bool = False
    population_leans: bool = False
    formation_leans: bool = False
    undecided_stray: bool = False
    phases: bool = False
    tracker: bool = False
    effective_sizes: bool = False
    part_breakdowns: bool = False
    turnout_tilt: bool = False
    past_elections: int = 0


SMALL_ELECTION = ElectionSize(
    parties=4,
    regions=3,
    seats=30,
    houses=5,
    polls=60,
    weeks=40,
    polled_weeks=38,
    regional_party=False,
    new_party=False,
    dissolved_party=False,
    alliances=False,
    special_rows=False,
)

UNTIDY_ELECTION = ElectionSize(
    ramp=True,
    jolts=1,
    method_changes=True,
    mode_leans=True,
    population_leans=True,
    formation_leans=True,
    undecided_stray=True,
    phases=True,
    tracker=True,
    effective_sizes=True,
    part_breakdowns=True,
    turnout_tilt=True,
    past_elections=5,
)
"""A whole election with everything that makes a register hard to read."""


YEARS_BETWEEN = 4
LOCAL_SD_LOG_SD = 0.5
"""Some of these countries have far quieter seats than others, some far noisier."""
TRACKED_DAYS = 24
LAST_FREE_DAYS = 35
"""Days that a tracking house still needs for its other polls."""


def draw_scenery(size: ElectionSize, *, rng: np.random.Generator) -> Scenery:
    """Draw the habits of a nameless election of a given size.

    Raises
    ------
    ValueError
        Where the size leaves no plain party, fewer seats than regions, or no room for the polls.
    """
    _check_size(size)
    polling_day = date(2030, 6, 2)
    regions = tuple(
        MadeUpRegion(f"R{i + 1}", f"Region {i + 1}", tuple(f"R{i + 1} seat {k + 1}" for k in range(count)))
        for i, count in enumerate(_split(size.seats, parts=size.regions))
    )
    parties = _nameless_parties(size, regions=regions)
    alliances: tuple[MadeUpAlliance, ...] = ()
    if size.alliances:
        start = polling_day - timedelta(weeks=max(size.polled_weeks * 2 // 3, 1))
        alliances = (MadeUpAlliance("AL", "Alliance of two", (parties[0].code, parties[2].code), start),)
    scenery = Scenery(
        title="A made-up election",
        last_election=polling_day - timedelta(weeks=size.weeks),
        polling_day=polling_day,
        first_fieldwork=polling_day - timedelta(weeks=size.polled_weeks),
        register_end=polling_day - timedelta(days=size.silent_days),
        parties=parties,
        regions=regions,
        houses=_nameless_houses(size, parties=parties, alliances=alliances, rng=rng),
        polls=size.polls,
        alliances=alliances,
        dissolved=("OLD", 0.05) if size.dissolved_party else None,
        drift=size.drift,
    )
    houses = tuple(
        _untidy(house, number=i, size=size, scenery=scenery) for i, house in enumerate(scenery.houses)
    )
    return replace(
        scenery,
        regions=_in_phases(scenery) if size.phases else scenery.regions,
        houses=houses,
        # Drawn last, so that a ramp leaves all other habits as they were.
        ramp_log_height=float(RAMP_LOG_SD * rng.normal()) if size.ramp else 0.0,
        jolts=tuple(
            MadeUpJolt(
                polling_day - timedelta(days=size.polled_weeks * 7 * (k + 1) // (size.jolts + 1)),
                f"Jolt {k + 1}",
            )
            for k in range(size.jolts)
        ),
        mode_leans=size.mode_leans,
        population_leans=size.population_leans,
        formation_leans=size.formation_leans,
        undecided_stray=size.undecided_stray,
        turnout_tilt=size.turnout_tilt,
        local_sd_log_sd=LOCAL_SD_LOG_SD,
        past_elections=tuple(
            scenery.last_election - timedelta(weeks=YEARS_BETWEEN * 52 * k)
            for k in range(size.past_elections)
        ),
    )


def _check_size(size: ElectionSize) -> None:
    plain = size.parties - size.regional_party - size.new_party
    if plain < (3 if size.alliances else 1):
        raise ValueError(f"{size.parties} parties leave {plain} plain ones; ask for more, or for less else.")
    if size.seats < size.regions:
        raise ValueError(f"{size.seats} seats are too few for {size.regions} regions.")
    if size.polled_weeks > size.weeks or size.polled_weeks < 3:
        raise ValueError(f"polled_weeks must lie between 3 and weeks = {size.weeks}: {size.polled_weeks}.")
    if not 1 <= size.silent_days <= (size.polled_weeks - 2) * 7:
        raise ValueError(f"silent_days must leave two weeks of {size.polled_weeks}: {size.silent_days}.")
    if size.formation_leans and not (size.alliances and size.special_rows and size.houses > 3):
        raise ValueError(
            "formation_leans needs alliances, special_rows and a fourth house, which pools them."
        )
    if size.phases and size.regions < 2:
        raise ValueError("phases need two regions or more.")
    if size.tracker and size.polled_weeks * 7 <= TRACKED_DAYS + LAST_FREE_DAYS + size.silent_days - 8:
        raise ValueError(f"polled_weeks = {size.polled_weeks} leave no room beside a tracker.")


def _in_phases(scenery: Scenery) -> tuple[MadeUpRegion, ...]:
    votes = scenery.polling_day - timedelta(days=14)
    early = replace(scenery.regions[-1], polling_day=votes, counted=votes + timedelta(days=3))
    return (*scenery.regions[:-1], early)


def _untidy(house: MadeUpHouse, *, number: int, size: ElectionSize, scenery: Scenery) -> MadeUpHouse:
    """Give a house the habits that the size asks for, by its number, so that no draw is needed."""
    habits: dict[str, object] = {}
    if size.method_changes and number % 3 == 0:
        change = scenery.polling_day - timedelta(weeks=size.polled_weeks // 2)
        habits["method"] = f"first way of {house.label}"
        habits["changes"] = (MethodChange(change, f"second way of {house.label}"),)
    if size.mode_leans and number % 4 == 1:
        habits["second_mode"] = "online" if house.mode == "telephone" else "telephone"
    if size.population_leans and number % 3 == 2:
        habits["population"] = "adults"
    if size.undecided_stray and number % 3 == 1 and house.undecided is None:
        habits["undecided"] = 10.0
    if size.effective_sizes and number % 4 == 3:
        habits["gives_effective"] = True
    if size.part_breakdowns and number % 4 == 1:
        habits["breakdown"] = max(house.breakdown, 0.15)
        habits["breakdown_regions"] = scenery.region_codes[: max(1, size.regions // 2)]
    if size.tracker and number == size.houses - 1:
        habits["tracker"] = MadeUpTracker(scenery.register_end - timedelta(days=TRACKED_DAYS))
    return replace(house, **habits)  # type: ignore[arg-type]


def _split(total: int, *, parts: int) -> list[int]:
    return [total // parts + (i < total % parts) for i in range(parts)]


def _nameless_parties(size: ElectionSize, *, regions: tuple[MadeUpRegion, ...]) -> tuple[MadeUpParty, ...]:
    plain = size.parties - size.regional_party - size.new_party
    shares = 0.72 ** np.arange(plain)
    shares *= 0.95 / shares.sum()
    inherits: list[tuple[tuple[str, float], ...]] = [()] * plain
    if size.dissolved_party:
        inherits[-1] = (("OLD", 0.8),)
    parties = [
        MadeUpParty(f"P{i + 1}", f"Party {i + 1}", float(shares[i]), inherits=inherits[i])
        for i in range(plain)
    ]
    if size.regional_party:
        where = tuple(r.code for r in regions[:2])
        parties.append(MadeUpParty("PR", "Regional party", 0.04, regions=where))
    if size.new_party:
        parties.append(MadeUpParty("PN", "New party", 0.03, is_new=True))
    return tuple(parties)


def _nameless_houses(
    size: ElectionSize,
    *,
    parties: tuple[MadeUpParty, ...],
    alliances: tuple[MadeUpAlliance, ...],
    rng: np.random.Generator,
) -> tuple[MadeUpHouse, ...]:
    small = tuple(p.code for p in parties if p.usual_share < 0.06)
    houses = []
    for i in range(size.houses):
        special = size.special_rows
        houses.append(
            MadeUpHouse(
                name=f"House {chr(ord('A') + i)}" if size.houses <= 26 else f"House {i + 1}",
                label=f"H{i + 1}",
                mode=str(rng.choice(["online", "telephone", "face_to_face", "mixed"])),
                usual_sample=int(rng.integers(700, 2400)),
                grid=float(rng.choice([1.0, 0.5, 0.1])),
                undecided=float(rng.uniform(6, 16)) if special and i % 3 == 1 else None,
                lumps=small if special and i % 4 == 2 else (),
                pools=tuple(a.code for a in alliances) if special and i % 5 == 3 else (),
                regional=0.3 if special and size.regions > 1 and i % 3 == 0 else 0.0,
                breakdown=0.15 if special and size.regions > 1 and i % 4 == 1 else 0.0,
                lists_others=bool(rng.random() < 0.7),
                activity=float(rng.uniform(0.5, 1.5)),
            )
        )
    return tuple(houses)
