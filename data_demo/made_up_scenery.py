"""What stands before anything is drawn: the calendar, parties, regions and houses of an invented election.

A :class:`Scenery` written by hand names everything; ``made_up_size`` draws a nameless one of some size.
Both lead to the same simulation.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np

from data_demo.made_up_counting import MixedCounting

OTHERS = "OTH"
TARGET_POPULATION = "voters"
"""Whom the result is about: a house that asks them has no population lean."""


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
    """A region and the names of its seats.

    Attributes
    ----------
    polling_day
        The day it votes where that is before the contest's; its support stands still from then on.
    counted
        The day its count is published, before the contest's polling day.
    members
        Members that each of its seats elects; empty where it is one everywhere.
    clusters
        Name of each seat's cluster of neighbours, blank for none; empty where no seat has one.
    voters_per_member
        Votes per member over the usual number.
    """

    code: str
    name: str
    seat_names: tuple[str, ...]
    polling_day: date | None = None
    counted: date | None = None
    members: tuple[int, ...] = ()
    clusters: tuple[str, ...] = ()
    voters_per_member: float = 1.0

    @property
    def members_by_seat(self) -> tuple[int, ...]:
        """Members that each seat elects."""
        return self.members or (1,) * len(self.seat_names)


@dataclass(frozen=True)
class SinceBeforeLast:
    """What is new since the election before the last one, whose result is at hand."""

    parties: tuple[str, ...] = ()
    seats: tuple[str, ...] = ()


@dataclass(frozen=True)
class MadeUpJolt:
    """A day on which opinion jumps as far as it otherwise does in some weeks."""

    day: date
    name: str
    weeks: float = 4.0


@dataclass(frozen=True)
class MethodChange:
    """A house works in another way from a day on, under a label of its own; None leaves its mode."""

    day: date
    method: str
    mode: str | None = None


@dataclass(frozen=True)
class MadeUpTracker:
    """Interviews every day of a campaign's end, published as windows that overlap.

    Attributes
    ----------
    first_day
        First day of interviews; they go on until the register ends.
    window_days, every_days
        Days of a window, and how often one is published; each on the day after its last interview.
    sample
        Interviews of a whole window.
    """

    first_day: date
    window_days: int = 5
    every_days: int = 2
    sample: int = 1000
    sponsor: str = ""


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
    breakdown_regions
        Regions it then prints beside the national figures; None is all.
    lists_others
        It prints the others' share; otherwise they are what is missing to 100.
    activity
        Relative number of polls.
    method
        Its label for its way of working, before any change.
    changes
        Days from which it works in another way, in order.
    second_mode, second_mode_part
        A mode it uses now and then, and the part of its polls that do.
    gives_effective
        It publishes the effective size of its samples.
    tracker
        A tracking poll that it runs beside its other polls, in place of those during the last weeks.
    """

    name: str
    label: str
    mode: str = "online"
    population: str = TARGET_POPULATION
    usual_sample: int = 1200
    grid: float = 0.1
    undecided: float | None = None
    lumps: tuple[str, ...] = ()
    pools: tuple[str, ...] = ()
    regional: float = 0.0
    breakdown: float = 0.0
    breakdown_regions: tuple[str, ...] | None = None
    lists_others: bool = True
    activity: float = 1.0
    sponsors: tuple[str, ...] = ("",)
    method: str = ""
    changes: tuple[MethodChange, ...] = ()
    second_mode: str | None = None
    second_mode_part: float = 0.3
    gives_effective: bool = False
    tracker: MadeUpTracker | None = None

    @property
    def methods(self) -> tuple[str, ...]:
        """Labels of its ways of working, the first one first."""
        return (self.method, *(change.method for change in self.changes))

    def era_on(self, day: date) -> int:
        """Position in ``methods`` of the way it works on a day."""
        return sum(change.day <= day for change in self.changes)

    def main_mode(self, era: int) -> str:
        """Mode of most of its polls in an era."""
        named = [self.mode, *(change.mode for change in self.changes[:era])]
        return next(mode for mode in reversed(named) if mode is not None)


@dataclass(frozen=True)
class Scenery:
    """Everything known about an invented election before its numbers are drawn.

    Attributes
    ----------
    first_fieldwork, register_end
        First day a poll may start, last day one may be published.
    polls
        Polls of the register, those of trackers not among them.
    dissolved
        Party that stood last time only: code and usual share.
    drift
        Factor on the usual scales of drift: below one for a calmer country.
    jolts
        Days on which opinion jumps; those of the contest file, and true.
    ramp_log_height
        Log of how much faster than usual opinion moves on polling day; zero is steady.
    mode_leans, population_leans, formation_leans
        Whether the mode, a population other than the target, and asking about an alliance as one make
        figures differ.
    undecided_stray
        Whether the undecided may in the end break otherwise than the decided.
    turnout_tilt
        Whether regions where a party is strong turn out more or less than others.
    local_sd_log_sd
        How far the parties' local noise differs from its usual size, sd of its log.
    past_elections
        Days of the elections in the record of past polling errors.
    counting
        How votes become seats; None where the most votes win every seat.
    since_before_last
        Where there is a result of the election before the last one: what is new since then.
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
    jolts: tuple[MadeUpJolt, ...] = ()
    ramp_log_height: float = 0.0
    mode_leans: bool = False
    population_leans: bool = False
    formation_leans: bool = False
    undecided_stray: bool = False
    turnout_tilt: bool = False
    local_sd_log_sd: float = 0.25
    past_elections: tuple[date, ...] = ()
    counting: MixedCounting | None = None
    since_before_last: SinceBeforeLast | None = None

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
        """Seats of the chamber, before it grows where it may."""
        from_lists = self.counting.list_seats if self.counting is not None else 0
        return from_lists + sum(sum(r.members_by_seat) for r in self.regions)

    @property
    def undecided(self) -> float:
        """Usual part of the respondents without an answer, 0–1, over the houses that publish it."""
        said = [(h.undecided, h.activity) for h in self.houses if h.undecided is not None]
        return sum(u * a for u, a in said) / sum(a for _, a in said) / 100 if said else 0.0

    def standing(self) -> np.ndarray:
        """Which party stands where: booleans, dims (region, party), others everywhere."""
        rows = [
            [p.regions is None or r.code in p.regions for p in self.parties] + [True] for r in self.regions
        ]
        return np.array(rows)

    def regions_voting_after(self, day: date) -> tuple[str, ...]:
        """Codes of the regions that have not voted by the end of a day."""
        return tuple(r.code for r in self.regions if (r.polling_day or self.polling_day) > day)
