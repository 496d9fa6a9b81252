"""Sorrelmark: an invented country whose diet is filled by three rules, its parties, regions and pollsters.

Colours come from three published colour-blind-safe sets of Tol (2021): "bright", "muted", "high-contrast".
"""

from __future__ import annotations

from datetime import date

from data_demo.made_up_counting import ANYONE, MadeUpTransfer, MixedCounting
from data_demo.made_up_scenery import (
    MadeUpAlliance,
    MadeUpHouse,
    MadeUpParty,
    MadeUpRegion,
    Scenery,
    SinceBeforeLast,
)

PARTIES = (
    MadeUpParty("CB", "Common Bench", 0.27, colour="#4477AA", regional_spread=0.20, seat_spread=0.40),
    MadeUpParty("GH", "Guild and Hearth", 0.26, colour="#EE6677", regional_spread=0.20, seat_spread=0.40),
    MadeUpParty("LT", "Long Table", 0.15, colour="#CCBB44", seat_spread=0.40),
    MadeUpParty("TF", "Third Furrow", 0.11, colour="#228833", seat_spread=0.45),
    MadeUpParty("EK", "Even Keel", 0.06, colour="#66CCEE"),
    MadeUpParty("PL", "Plumb Line", 0.05, colour="#AA3377"),
    MadeUpParty("MV", "Moorland Voice", 0.028, colour="#332288", regions=("WEIR", "MOOR")),
)

ALLIANCES = (
    MadeUpAlliance("BENCH", "Bench and Keel", ("CB", "EK"), date(2024, 3, 2), colour="#004488"),
    MadeUpAlliance("HEARTH", "Hearth Compact", ("GH", "PL"), date(2024, 9, 14), colour="#BB5566"),
)

COUNTING = MixedCounting(
    list_seats=40,
    threshold=4.0,
    exempt=("MV",),
    by_district=("CITY",),
    by_two_rounds=("HOLM",),
    transfers=(
        MadeUpTransfer(ANYONE, ANYONE, 30.0, 12.0),
        MadeUpTransfer("EK", "CB", 65.0, 8.0),
        MadeUpTransfer("EK", "GH", 12.0, 5.0),
        MadeUpTransfer("PL", "GH", 65.0, 8.0),
        MadeUpTransfer("PL", "CB", 10.0, 5.0),
        MadeUpTransfer("TF", "CB", 45.0, 9.0),
        MadeUpTransfer("TF", "GH", 22.0, 8.0),
        MadeUpTransfer("LT", "GH", 42.0, 9.0),
        MadeUpTransfer("OTH", ANYONE, 20.0, 8.0),
    ),
)

_SEATS_IN_CLUSTERS = {
    "WEIR": (("Millrace", 4), ("Long Weir", 4), ("Staunch Reach", 3), ("Fordside", 3)),
    "HOPS": (("Kilnside", 4), ("Bine Hollow", 3), ("Trellis Vale", 3), ("Pocket Hills", 3)),
    "SALT": (("Panners' Shore", 4), ("Brine Bank", 4), ("Samphire Flats", 3)),
    "MOOR": (("Peatcut", 4), ("Lingridge", 3), ("Cottongrass", 3)),
    "HOLM": (("Windward Holms", 3), ("Lee Holms", 3)),
}

_REGION_NAMES = {
    "CITY": "Tallowgate",
    "WEIR": "Weirlands",
    "HOPS": "Hop Country",
    "SALT": "The Saltings",
    "MOOR": "Rookmoor",
    "HOLM": "Outer Holms",
}

_DISTRICTS = (("Old Quay", 5), ("Ropewalk", 6), ("Lanternhill", 5), ("Brewhouse", 6))
"""Districts of the capital, with the members that each elects."""

_VOTERS_PER_MEMBER = {"HOLM": 0.7}
_VOTERS_BY_LOCAL_SEAT = 1.8
"""A local seat is larger where lists fill seats too, so that there are about as many voters per member."""

_STEMS = (
    "Aldru", "Ansga", "Crendo", "Dolva", "Ethri", "Fandu", "Grenti", "Hespa", "Hulmo",
    "Imbri", "Isthe", "Kestu", "Lodra", "Mirvo", "Nantra", "Odwi", "Ostwi", "Pirre",
    "Prelo", "Quendo", "Rindo", "Sarvi", "Sulga", "Tessa", "Torva", "Trevu", "Ulga",
    "Urdo", "Vanthi", "Wendro", "Wolmi", "Yarro", "Zelmi",
)  # fmt: skip
_ENDINGS = ("garth", "holt", "rigg", "staith", "croft", "lathe", "bield")


def _regions() -> tuple[MadeUpRegion, ...]:
    """Name every seat once, by a stem and an ending in turn, and put neighbours into clusters."""
    districts = tuple(name for name, _ in _DISTRICTS)
    members = tuple(count for _, count in _DISTRICTS)
    regions = [MadeUpRegion("CITY", _REGION_NAMES["CITY"], districts, members=members)]
    start = 0
    for code, clusters in _SEATS_IN_CLUSTERS.items():
        of_seat = [name for name, count in clusters for _ in range(count)]
        places = range(start, start + len(of_seat))
        names = [_STEMS[k % len(_STEMS)] + _ENDINGS[(2 * k) % len(_ENDINGS)] for k in places]
        regions.append(
            MadeUpRegion(
                code,
                _REGION_NAMES[code],
                tuple(names),
                clusters=tuple(of_seat),
                voters_per_member=_VOTERS_PER_MEMBER.get(code, _VOTERS_BY_LOCAL_SEAT),
            )
        )
        start += len(of_seat)
    return tuple(regions)


HOUSES = (
    MadeUpHouse(
        "Quillern",
        "QUI",
        "online",
        usual_sample=1600,
        activity=1.4,
        breakdown=0.3,
        sponsors=("The Sorrel Gazette", ""),
    ),
    MadeUpHouse(
        "Thessoward Polls",
        "THE",
        "telephone",
        usual_sample=1000,
        grid=1.0,
        undecided=12.0,
        sponsors=("Radio Weir", "The Sorrel Gazette"),
    ),
    MadeUpHouse(
        "Ondrell Panel",
        "OND",
        "online",
        usual_sample=2000,
        activity=1.2,
        lumps=("MV",),
        lists_others=False,
        sponsors=("",),
    ),
    MadeUpHouse(
        "Harrovane Research",
        "HAR",
        "telephone",
        usual_sample=1200,
        grid=0.5,
        regional=0.3,
        sponsors=("Rookmoor Herald", "Tallowgate Evening Bell"),
    ),
    MadeUpHouse(
        "Tibberlow",
        "TIB",
        "online",
        usual_sample=900,
        regional=0.4,
        activity=0.8,
        sponsors=("Tallowgate Evening Bell", "Holms Mail"),
    ),
    MadeUpHouse(
        "Mobrick Surveys",
        "MOB",
        "online",
        usual_sample=1300,
        grid=0.5,
        undecided=9.0,
        activity=0.7,
        sponsors=("", "Guild of Hop Growers"),
    ),
)

SORRELMARK = Scenery(
    title="Diet of Sorrelmark 2025",
    last_election=date(2021, 10, 10),
    polling_day=date(2025, 10, 12),
    first_fieldwork=date(2024, 8, 3),
    register_end=date(2025, 10, 3),
    parties=PARTIES,
    regions=_regions(),
    houses=HOUSES,
    polls=80,
    alliances=ALLIANCES,
    others_share=0.04,
    drift=0.6,
    mode_leans=True,
    undecided_stray=True,
    counting=COUNTING,
    since_before_last=SinceBeforeLast(parties=("EK",), seats=("Ulgastaith",)),
)
