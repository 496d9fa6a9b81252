"""What stands before anything is drawn: the calendar, parties, regions and houses of an invented election.

:class:`ElectionSize` asks for a nameless election of some size; a :class:`Scenery` written by hand
gives it names. Both lead to the same simulation.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np

OTHERS = "OTH"


@dataclass(frozen=True)
class MadeUpParty:
    """A party and what it tends to be.

    Attributes
    ----------
    usual_share
        National share around which the last result is drawn; for a new party, its first share.
    regions
        Codes of the regions it stands in; None is everywhere.
    inherits
        Share of a dissolved party's last votes that it takes over, by the dissolved party's code.
    is_new
        It has no last votes of its own.
    regional_spread, seat_spread
        Sd of its log share between regions, and between the seats of a region.
    """

    code: str
    name: str
    usual_share: float
    colour: str | None = None
    regions: tuple[str, ...] | None = None
    inherits: tuple[tuple[str, float], ...] = ()
    is_new: bool = False
    regional_spread: float = 0.25
    seat_spread: float = 0.35


@dataclass(frozen=True)
class MadeUpAlliance:
    """Parties that campaign together, from a day on (None: since before the last election)."""

    code: str
    name: str
    members: tuple[str, ...]
    from_: date | None = None
    colour: str | None = None


@dataclass(frozen=True)
class MadeUpRegion:
    """A region and the names of its seats."""

    code: str
    name: str
    seat_names: tuple[str, ...]


@dataclass(frozen=True)
class MadeUpHouse:
    """A polling organisation and its habits.

    Attributes
    ----------
    grid
        Its shares are rounded to multiples of this many points.
    undecided
        Usual percentage without an answer that it publishes; None where it leaves them out.
    lumps
        Codes it often does not list, so that they are answered as others.
    pools
        Alliances whose members it asks about together.
    regional
        Chance that a poll of its asks in one region only.
    breakdown
        Chance that a national poll of its is published region by region.
    lists_others
        It prints the others' share; otherwise they are what is missing to 100.
    activity
        Relative number of polls.
    """

    name: str
    label: str
    mode: str = "online"
    population: str = "voters"
    usual_sample: int = 1200
    grid: float = 0.1
    undecided: float | None = None
    lumps: tuple[str, ...] = ()
    pools: tuple[str, ...] = ()
    regional: float = 0.0
    breakdown: float = 0.0
    lists_others: bool = True
    activity: float = 1.0
    sponsors: tuple[str, ...] = ("",)


@dataclass(frozen=True)
class Scenery:
    """Everything known about an invented election before its numbers are drawn.

    Attributes
    ----------
    first_fieldwork, register_end
        First day a poll may start, last day one may be published.
    dissolved
        Party that stood last time only: code and usual share.
    drift
        Factor on the usual scales of drift: below one for a calmer country.
    """

    title: str
    last_election: date
    polling_day: date
    first_fieldwork: date
    register_end: date
    parties: tuple[MadeUpParty, ...]
    regions: tuple[MadeUpRegion, ...]
    houses: tuple[MadeUpHouse, ...]
    polls: int
    alliances: tuple[MadeUpAlliance, ...] = ()
    dissolved: tuple[str, float] | None = None
    others_share: float = 0.05
    drift: float = 1.0

    @property
    def codes(self) -> tuple[str, ...]:
        """Party codes in file order, others last."""
        return (*(p.code for p in self.parties), OTHERS)

    @property
    def region_codes(self) -> tuple[str, ...]:
        """Region codes in file order."""
        return tuple(r.code for r in self.regions)

    @property
    def seat_count(self) -> int:
        """Seats of the chamber."""
        return sum(len(r.seat_names) for r in self.regions)

    def standing(self) -> np.ndarray:
        """Which party stands where: booleans, dims (region, party), others everywhere."""
        rows = [
            [p.regions is None or r.code in p.regions for p in self.parties] + [True] for r in self.regions
        ]
        return np.array(rows)


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
    special_rows
        Whether houses lump small parties, pool alliances, ask in one region, break down by region and
        publish undecided; without them each poll is national and lists every party.
    """

    parties: int = 7
    regions: int = 8
    seats: int = 200
    houses: int = 9
    polls: int = 250
    weeks: int = 209
    polled_weeks: int = 78
    regional_party: bool = True
    new_party: bool = True
    dissolved_party: bool = True
    alliances: bool = True
    special_rows: bool = True


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
    return Scenery(
        title="A made-up election",
        last_election=polling_day - timedelta(weeks=size.weeks),
        polling_day=polling_day,
        first_fieldwork=polling_day - timedelta(weeks=size.polled_weeks),
        register_end=polling_day - timedelta(days=8),
        parties=parties,
        regions=regions,
        houses=_nameless_houses(size, parties=parties, alliances=alliances, rng=rng),
        polls=size.polls,
        alliances=alliances,
        dissolved=("OLD", 0.05) if size.dissolved_party else None,
    )


def _check_size(size: ElectionSize) -> None:
    plain = size.parties - size.regional_party - size.new_party
    if plain < (3 if size.alliances else 1):
        raise ValueError(f"{size.parties} parties leave {plain} plain ones; ask for more, or for less else.")
    if size.seats < size.regions:
        raise ValueError(f"{size.seats} seats are too few for {size.regions} regions.")
    if size.polled_weeks > size.weeks or size.polled_weeks < 3:
        raise ValueError(f"polled_weeks must lie between 3 and weeks = {size.weeks}: {size.polled_weeks}.")


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
