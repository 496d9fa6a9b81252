"""The Lake Provinces: an invented country, its parties, its regions and its pollsters.

Colours come from two published colour-blind-safe sets: Okabe and Ito (2008) and Tol (2021, "muted").
"""

from __future__ import annotations

from datetime import date

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

PARTIES = (
    MadeUpParty("HU", "Harbour Union", 0.29, colour="#0072B2", seat_spread=0.40),
    MadeUpParty("UP", "Upland Party", 0.26, colour="#D55E00", regional_spread=0.30, seat_spread=0.40),
    MadeUpParty("CC", "Civic Compact", 0.15, colour="#E69F00", seat_spread=0.45),
    MadeUpParty("TL", "Tillage League", 0.065, colour="#999933", inherits=(("RF", 0.8),), seat_spread=0.50),
    MadeUpParty("WS", "Watershed", 0.07, colour="#009E73", seat_spread=0.45),
    MadeUpParty("OL", "Orchard League", 0.045, colour="#CC79A7", regions=("ORCH", "VALE")),
    MadeUpParty("NL", "New Lantern", 0.035, colour="#56B4E9", is_new=True),
    MadeUpParty("SH", "Shoreline", 0.028, colour="#882255", seat_spread=0.45),
)

ALLIANCES = (
    MadeUpAlliance("LAKE", "Lake Alliance", ("HU", "WS", "SH"), date(2021, 11, 20), colour="#332288"),
    MadeUpAlliance("HILL", "Hill and Field Pact", ("UP", "TL"), date(2025, 3, 1), colour="#661100"),
)

_REGIONS = (
    ("NORTH", "Northern Shore", 31),
    ("HARB", "Harbour Coast", 36),
    ("MERE", "Upper Mere", 27),
    ("ISLE", "The Hundred Isles", 13),
    ("REED", "Reedlands", 22),
    ("VALE", "Copper Vale", 25),
    ("ORCH", "Orchard Country", 24),
    ("HIGH", "High Pastures", 22),
)

_VOTES_EARLY = {"ISLE": (date(2026, 5, 3), date(2026, 5, 6))}
"""Polling day, and the day its count is published, of a region that votes before the others."""

_STEMS = (
    "Abrel", "Arvo", "Beska", "Brunda", "Calvi", "Corra", "Dalmo", "Drevi", "Elgo",
    "Emba", "Farru", "Fenlo", "Galdi", "Gorva", "Halmi", "Havro", "Irsel", "Jorvu",
    "Kelda", "Korri", "Lanvo", "Lurma", "Marvi", "Morlu", "Nalder", "Nevra", "Oldru",
    "Orvel", "Pelmo", "Prenda", "Quarli", "Rasvo", "Rovel", "Selmu", "Skarvo",
)  # fmt: skip
_ENDINGS = ("mar", "ness", "wold", "sund", "thorn", "quay", "gate", "stow")


def _regions() -> tuple[MadeUpRegion, ...]:
    """Name every seat once: stems and endings in turn, so that neighbours in the list differ."""
    total = sum(count for _, _, count in _REGIONS)
    stems = len(_STEMS)
    names = [_STEMS[k % stems] + _ENDINGS[(k % stems + k // stems) % len(_ENDINGS)] for k in range(total)]
    regions, start = [], 0
    for code, name, count in _REGIONS:
        polling_day, counted = _VOTES_EARLY.get(code, (None, None))
        seats = tuple(sorted(names[start : start + count]))
        regions.append(MadeUpRegion(code, name, seats, polling_day, counted))
        start += count
    return tuple(regions)


_SMALL = ("SH", "NL")

HOUSES = (
    MadeUpHouse(
        "Tarvick Surveys",
        "TAR",
        "telephone",
        "voters",
        1050,
        1.0,
        undecided=11.0,
        activity=1.3,
        sponsors=("The Lakeshore Courier", "The Lakeshore Courier", "Channel Six Delta"),
        method="calls to landlines and mobiles",
        changes=(MethodChange(date(2025, 7, 1), "calls and own web panel", mode="mixed"),),
    ),
    MadeUpHouse(
        "Pelloran Panel",
        "PEL",
        "online",
        "voters",
        2100,
        0.1,
        breakdown=0.20,
        activity=1.5,
        sponsors=("", "Mere Morning"),
        tracker=MadeUpTracker(date(2026, 4, 11), sample=1500, sponsor="Mere Morning"),
    ),
    MadeUpHouse(
        "Veldane Institute",
        "VEL",
        "face_to_face",
        "adults",
        1500,
        0.5,
        undecided=16.0,
        activity=0.6,
        gives_effective=True,
        sponsors=("Chamber of Growers", "", "Board of Lake Ports"),
    ),
    MadeUpHouse(
        "Umbrick Field",
        "UMB",
        "mixed",
        "voters",
        1250,
        0.5,
        regional=0.35,
        breakdown=0.15,
        breakdown_regions=("NORTH", "HARB", "REED"),
        sponsors=("Evening Anchor", "Radio Reedlands", "Upland Gazette"),
    ),
    MadeUpHouse(
        "Dovrenna",
        "DOV",
        "online",
        "voters",
        1700,
        0.1,
        lumps=_SMALL,
        lists_others=False,
        activity=1.2,
        sponsors=("", "", "Channel Six Delta"),
    ),
    MadeUpHouse(
        "Ostrelle Polls",
        "OST",
        "telephone",
        "registered",
        900,
        1.0,
        lumps=_SMALL,
        activity=0.8,
        sponsors=("Upland Gazette",),
    ),
    MadeUpHouse(
        "Marrimund",
        "MAR",
        "online",
        "adults",
        1300,
        0.5,
        undecided=9.0,
        pools=("HILL",),
        second_mode="telephone",
        sponsors=("Evening Anchor", ""),
    ),
    MadeUpHouse(
        "Brislow Measure",
        "BRI",
        "mixed",
        "voters",
        1000,
        0.1,
        pools=("LAKE", "HILL"),
        lists_others=False,
        activity=0.7,
        sponsors=("Alliance Watch", ""),
    ),
    MadeUpHouse(
        "Ferrow Research",
        "FER",
        "online",
        "voters",
        800,
        1.0,
        regional=0.5,
        activity=0.9,
        sponsors=("Radio Reedlands", "Orchard Country Times", "Isles Weekly"),
    ),
)

LAKE_PROVINCES = Scenery(
    title="Assembly of the Lake Provinces 2026",
    last_election=date(2022, 5, 15),
    polling_day=date(2026, 5, 17),
    first_fieldwork=date(2024, 11, 2),
    register_end=date(2026, 5, 9),
    parties=PARTIES,
    regions=_regions(),
    houses=HOUSES,
    polls=250,
    alliances=ALLIANCES,
    dissolved=("RF", 0.04),
    others_share=0.035,
    drift=0.75,
    jolts=(MadeUpJolt(date(2025, 10, 6), "The leader of Harbour Union resigned"),),
    ramp_log_height=0.45,
    mode_leans=True,
    population_leans=True,
    formation_leans=True,
    undecided_stray=True,
    turnout_tilt=True,
    past_elections=(
        date(2006, 5, 14),
        date(2010, 5, 16),
        date(2014, 5, 18),
        date(2018, 5, 13),
        date(2022, 5, 15),
    ),
)
