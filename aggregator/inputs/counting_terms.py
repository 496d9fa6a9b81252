"""The terms by which votes become seats, as the desk writes them in ``contest.toml``."""

from __future__ import annotations

from decimal import Decimal
from enum import StrEnum
from typing import Annotated

from pydantic import Field

from aggregator.inputs.contest_table import ContestTable

# The first divisor that laws with a modified Sainte-Laguë method most often name.
USUAL_FIRST_DIVISOR = Decimal("1.4")
OUTRIGHT_MAJORITY = 50.0


class CountingRule(StrEnum):
    """How votes become seats."""

    NONE = "none"
    PLURALITY = "plurality"
    HIGHEST_AVERAGES = "highest_averages"
    LARGEST_REMAINDER = "largest_remainder"
    MIXED_PARALLEL = "mixed_parallel"
    MIXED_COMPENSATORY = "mixed_compensatory"
    TWO_ROUND = "two_round"


LIST_RULES = frozenset({CountingRule.HIGHEST_AVERAGES, CountingRule.LARGEST_REMAINDER})
MIXED_RULES = frozenset({CountingRule.MIXED_PARALLEL, CountingRule.MIXED_COMPENSATORY})


class Divisors(StrEnum):
    """The series by which votes are divided."""

    DHONDT = "dhondt"
    SAINTE_LAGUE = "sainte_lague"
    MODIFIED_SAINTE_LAGUE = "modified_sainte_lague"


class Quota(StrEnum):
    """The votes that a seat costs."""

    HARE = "hare"
    DROOP = "droop"


class Across(StrEnum):
    """Where votes are added up, the narrowest first."""

    DISTRICT = "district"
    REGION = "region"
    COUNTRY = "country"


class Overhang(StrEnum):
    """What happens where a party wins more seats locally than its part of all seats."""

    KEPT = "kept"
    LEVELLED = "levelled"
    WITHIN = "within"


class TieBreak(StrEnum):
    """Who has the last seat where two lists have the same claim to it."""

    LOT = "lot"
    MOST_VOTES = "most_votes"


Percent = Annotated[float, Field(gt=0, lt=100)]
_PERCENT = "a percentage above 0 and below 100"


def _one_of(words: type[StrEnum]) -> str:
    return "one of " + ", ".join(words)


class CountingTerms(ContestTable):
    """A rule and its keys; which keys a rule takes is in ``aggregator.inputs.counting_keys``."""

    rule: CountingRule = Field(default=CountingRule.PLURALITY, description=_one_of(CountingRule))
    divisors: Divisors | None = Field(default=None, description=_one_of(Divisors))
    first_divisor: Decimal = Field(
        default=USUAL_FIRST_DIVISOR, ge=1, le=2, description="a number from 1 to 2, like 1.4"
    )
    quota: Quota | None = Field(default=None, description=_one_of(Quota))
    across: Across | None = Field(default=None, description=_one_of(Across))
    threshold: Percent | None = Field(default=None, description=_PERCENT)
    threshold_across: Across | None = Field(default=None, description=_one_of(Across))
    alliance_threshold: Percent | None = Field(default=None, description=_PERCENT)
    exempt: tuple[str, ...] = Field(default=(), description="a list of party codes")
    ties: TieBreak = Field(default=TieBreak.LOT, description=_one_of(TieBreak))
    list_seats: int | None = Field(default=None, ge=1, description="a whole number of seats, 1 or more")
    overhang: Overhang = Field(default=Overhang.KEPT, description=_one_of(Overhang))
    outright: Percent = Field(default=OUTRIGHT_MAJORITY, description=_PERCENT)
    run_off_threshold: Percent | None = Field(default=None, description=_PERCENT)

    @property
    def has_lists(self) -> bool:
        """Whether some seats are filled from lists."""
        return self.rule in LIST_RULES or self.rule in MIXED_RULES

    @property
    def settled(self) -> CountingTerms:
        """The terms with ``across``, ``threshold_across`` and the method of lists filled in."""
        across = self.across or (Across.COUNTRY if self.rule in MIXED_RULES else Across.DISTRICT)
        divisors, quota = self.divisors, self.quota
        if self.has_lists and divisors is None and quota is None:
            if self.rule is CountingRule.LARGEST_REMAINDER:
                quota = Quota.HARE
            else:
                divisors = Divisors.DHONDT
        return self.model_copy(
            update={
                "across": across,
                "threshold_across": self.threshold_across or across,
                "divisors": divisors,
                "quota": quota,
            }
        )

    @property
    def elects_by_row(self) -> bool:
        """Whether rows of the last result, seats or districts, elect members.

        They do not where lists are added up over a region or the country and nobody is elected below.
        """
        return self.rule not in LIST_RULES or self.settled.across is Across.DISTRICT


class CountingWhere(CountingTerms):
    """Other terms in some regions; nothing is taken over from ``[counting]``."""

    regions: tuple[str, ...] = Field(min_length=1, description="a list of region codes")
    rule: CountingRule = Field(description=_one_of(CountingRule))


class Counting(CountingTerms):
    """The terms of the whole chamber, and of all regions without others of their own."""

    seats: int | None = Field(default=None, ge=1, description="a whole number of seats, 1 or more")
    majority: int | None = Field(default=None, ge=1, description="a whole number of seats, 1 or more")
    where: tuple[CountingWhere, ...] = Field(
        default=(), description="[[counting.where]], each with regions and a rule"
    )
