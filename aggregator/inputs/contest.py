"""A contest as the desk describes it in ``contest.toml``."""

from __future__ import annotations

from datetime import date
from typing import Annotated

from pydantic import BeforeValidator, Field

from aggregator.inputs.contest_table import ContestTable
from aggregator.inputs.counting_terms import Counting, CountingTerms
from aggregator.inputs.counting_terms import CountingRule as CountingRule

OTHERS = "OTH"

# The region of a contest that names none.
WHOLE_COUNTRY = "ALL"


# A year outside is a slip of the hand (0231, 20310); it would also not fit into a nanosecond time stamp.
FIRST_DAY, LAST_DAY = date(1900, 1, 1), date(2199, 12, 31)


def _no_number(value: object) -> object:
    # Pydantic reads a number as seconds since 1970; here it is a date without its dashes.
    if isinstance(value, (int, float)):
        raise ValueError("a number is not a date")
    return value


Day = Annotated[date, BeforeValidator(_no_number), Field(ge=FIRST_DAY, le=LAST_DAY)]
Colour = Annotated[str, Field(pattern=r"^#[0-9a-fA-F]{6}$")]


class Party(ContestTable):
    """A party: its code (the column name in every file), its name, where it stands."""

    code: str = Field(description="a short code like HU, the party's column in every file")
    name: str = Field(min_length=1, description="the party's name")
    regions: tuple[str, ...] | None = Field(
        default=None, min_length=1, description="a list of region codes, where it stands only there"
    )
    inherits: dict[str, Annotated[float, Field(gt=0, le=1)]] = Field(
        default_factory=dict, description="a part of another column's last votes, above 0 and up to 1"
    )
    colour: Colour | None = Field(default=None, description="a colour like #1f6f8b")


class Alliance(ContestTable):
    """Parties that are polled or counted together, from one day to another; either end may be open."""

    code: str = Field(description="a short code like LAKE, the alliance's column in the poll register")
    name: str = Field(min_length=1, description="the alliance's name")
    members: tuple[str, ...] = Field(description="a list of two or more party codes")
    from_: Day | None = Field(default=None, alias="from", description="its first day, like 2030-11-01")
    until: Day | None = Field(default=None, description="its last day, like 2031-05-18")
    colour: Colour | None = Field(default=None, description="a colour like #1f6f8b")
    joint_list: bool = Field(default=False, strict=True, description="true or false")

    def active_on(self, day: date) -> bool:
        """Tell whether the alliance exists on a day (both ends included)."""
        return (self.from_ is None or self.from_ <= day) and (self.until is None or day <= self.until)

    def meets(self, other: Alliance) -> bool:
        """Tell whether two alliances exist on some day together."""
        starts = [d for d in (self.from_, other.from_) if d is not None]
        ends = [d for d in (self.until, other.until) if d is not None]
        return not starts or not ends or max(starts) <= min(ends)


class Region(ContestTable):
    """A part of the country with its own support; ``electorate`` weighs it where no last result does.

    ``counted`` is the day on which the count of a region that votes early was published; ``list_seats`` are
    filled from lists of the region.
    """

    code: str = Field(description="a short code like NORTH, used in the region column of every file")
    name: str = Field(min_length=1, description="the region's name")
    polling_day: Day | None = Field(default=None, description="the region's own polling day, like 2031-05-11")
    electorate: float | None = Field(default=None, gt=0, description="the number of voters, above 0")
    counted: Day | None = Field(default=None, description="the day its count was published, like 2031-05-14")
    list_seats: int | None = Field(default=None, ge=1, description="a whole number of seats, 1 or more")


class LastResult(ContestTable):
    """When the last election was and which file holds it."""

    date: Day = Field(description="the day of the last election, like 2027-05-16")
    file: str = Field(
        default="result_last.csv",
        pattern=r"^[^/\\]+\.(csv|CSV|xlsx|XLSX)$",
        description="the name of a .csv or .xlsx file in the contest folder",
    )


class Jolt(ContestTable):
    """A day on which opinion may have jumped: a leader goes, an alliance breaks."""

    date: Day = Field(description="the day, like 2031-02-03")
    weeks: float = Field(default=4.0, gt=0, le=52, description="a number of weeks, above 0 and up to 52")
    name: str = Field(default="", description="what happened, as text")


class Silence(ContestTable):
    """A window in which local law forbids publishing polls: both ends included, in one time zone."""

    from_: Day = Field(alias="from", description="the first day, like 2031-05-16")
    until: Day = Field(description="the last day, like 2031-05-18")
    time_zone: str = Field(default="UTC", description="a time zone like Europe/Paris")
    regions: tuple[str, ...] | None = Field(default=None, min_length=1, description="a list of region codes")
    law: str | None = Field(default=None, description="the law, as text")


class ReleaseRules(ContestTable):
    """What the desk says about publication."""

    silence: tuple[Silence, ...] = Field(default=(), description="windows, each with from and until")
    publisher: str | None = Field(default=None, description="the publisher's name")


class ModelOverrides(ContestTable):
    """Settings of the model that a contest may override; every default stands in ``docs/method.md``."""

    shared_lean: bool = Field(default=True, strict=True, description="true or false")
    shared_lean_points: float = Field(default=2.5, gt=0, le=20, description="points, above 0 and up to 20")
    shared_lean_correlation: float = Field(default=1 / 3, ge=0, le=1, description="a number from 0 to 1")
    ramp: bool = Field(default=True, strict=True, description="true or false")
    target_population: str = Field(
        default="voters", min_length=1, description="a label of the register's population column"
    )


class Contest(ContestTable):
    """One election: parties, alliances, regions, how votes become seats, publication rules."""

    title: str = Field(min_length=1, description="the contest's title")
    polling_day: Day = Field(description="a date like 2031-05-18, without quotation marks")
    parties: tuple[Party, ...] = Field(
        alias="party", min_length=1, description="one [[party]] or more, each with code and name"
    )
    alliances: tuple[Alliance, ...] = Field(
        default=(), alias="alliance", description="[[alliance]], each with code, name and members"
    )
    regions: tuple[Region, ...] = Field(
        default=(), alias="region", description="[[region]], each with code and name"
    )
    last_result: LastResult | None = Field(default=None, description="[last_result] with date and file")
    jolts: tuple[Jolt, ...] = Field(
        default=(), alias="jolt", description="[[jolt]], each with a date, weeks and a name"
    )
    counting: Counting = Field(default=Counting(), description="[counting] with rule, seats, majority")
    others: bool = Field(default=True, strict=True, description="true or false")
    release: ReleaseRules = Field(default=ReleaseRules(), description="[release] with silence, publisher")
    model: ModelOverrides = Field(default=ModelOverrides(), description="[model] with overrides")

    @property
    def party_codes(self) -> tuple[str, ...]:
        """Codes of all parties in file order, ``OTH`` last where others exist."""
        codes = tuple(p.code for p in self.parties)
        return (*codes, OTHERS) if self.others and OTHERS not in codes else codes

    @property
    def party_names(self) -> dict[str, str]:
        """Name of each party by code, others included."""
        names = {p.code: p.name for p in self.parties}
        if self.others:
            names.setdefault(OTHERS, "Others")
        return names

    @property
    def column_names(self) -> dict[str, str]:
        """Name of each party and alliance by code, others included."""
        return self.party_names | {a.code: a.name for a in self.alliances}

    @property
    def region_codes(self) -> tuple[str, ...]:
        """Codes of all regions in file order; one nameless region, ``ALL``, where there are none."""
        return tuple(r.code for r in self.regions) or (WHOLE_COUNTRY,)

    @property
    def counting_groups(self) -> tuple[tuple[CountingTerms, tuple[str, ...]], ...]:
        """Settled terms and the regions they hold in: of the whole chamber first, then of each exception.

        Every region is in one group; a group without any is left out.
        """
        apart = {region for where in self.counting.where for region in where.regions}
        found: list[tuple[CountingTerms, set[str]]] = [(self.counting, set(self.region_codes) - apart)]
        found += [(where, set(where.regions)) for where in self.counting.where]
        groups = []
        taken: set[str] = set()
        for terms, named in found:
            regions = tuple(r for r in self.region_codes if r in named - taken)
            taken.update(regions)
            if regions:
                groups.append((terms.settled, regions))
        return tuple(groups)

    def terms_in(self, region: str) -> CountingTerms:
        """Give the settled terms by which a region counts."""
        for terms, regions in self.counting_groups:
            if region in regions:
                return terms
        return self.counting.settled

    def polling_day_of(self, region: str) -> date:
        """Give a region's polling day: its own where voting is in phases, else the contest's."""
        own = {r.code: r.polling_day for r in self.regions}.get(region)
        return own or self.polling_day

    def stands_in(self, party: str, region: str) -> bool:
        """Tell whether a party stands in a region; others stand everywhere."""
        where = {p.code: p.regions for p in self.parties}.get(party)
        return where is None or region in where

    @property
    def column_codes(self) -> tuple[str, ...]:
        """Codes that may head a column of the poll register: parties, others, alliances."""
        return (*self.party_codes, *(a.code for a in self.alliances))

    @property
    def last_polling_day(self) -> date:
        """The day on which the last region votes."""
        return max(self.polling_day_of(r) for r in self.region_codes)

    def members_of(self, code: str) -> tuple[str, ...]:
        """List the parties a column counts: an alliance's members, or the party itself."""
        for alliance in self.alliances:
            if alliance.code == code:
                return alliance.members
        return (code,)

    def known_on(self, day: date) -> Contest:
        """Give the contest as it could be written on a day, at its end.

        Nobody knew of a later jolt, of an alliance that forms later, that one would break up later, or of a
        count published later. Parties, regions, seats and polling days bear no date of their own and stay.
        """
        alliances = (a for a in self.alliances if a.from_ is None or a.from_ <= day)
        return self.model_copy(
            update={
                "jolts": tuple(j for j in self.jolts if j.date <= day),
                "alliances": tuple(
                    a if a.until is None or a.until <= day else a.model_copy(update={"until": None})
                    for a in alliances
                ),
                "regions": tuple(
                    r if r.counted is None or r.counted <= day else r.model_copy(update={"counted": None})
                    for r in self.regions
                ),
            }
        )
