"""The methods that a replay compares, what they are compared on, and how tables and charts call them."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum


class Method(StrEnum):
    """The program itself, and its rivals: what a desk could do without a model."""

    FIELDFOLD = "fieldfold"
    LATEST_POLL = "latest_poll"
    MEAN_30_DAYS = "mean_30_days"
    DECAYING_MEAN = "decaying_mean"
    LAST_RESULT = "last_result"
    UNIFORM_SWING = "uniform_swing"


METHOD_NAMES = {
    Method.FIELDFOLD: "this model",
    Method.LATEST_POLL: "the latest poll",
    Method.MEAN_30_DAYS: "the mean of the last 30 days",
    Method.DECAYING_MEAN: "the decaying mean",
    Method.LAST_RESULT: "the last result",
    Method.UNIFORM_SWING: "uniform swing",
}
RIVALS = tuple(method for method in Method if method is not Method.FIELDFOLD)


class Quantity(StrEnum):
    """What is foretold: shares in percent, or seats, both on polling day."""

    SUPPORT = "support"
    SEATS = "seats"


class Where(StrEnum):
    """Whether figures for the country or for its regions are held against the result."""

    COUNTRY = "country"
    REGIONS = "regions"


@dataclass(frozen=True)
class Lead:
    """A band of days before polling day, both ends included."""

    first: int
    last: int | None

    @property
    def label(self) -> str:
        """The band as tables call it."""
        if self == EVERY_LEAD:
            return "all"
        return f"{self.first} or more" if self.last is None else f"{self.first} to {self.last}"

    def holds(self, days: float) -> bool:
        """Tell whether a number of days lies in the band."""
        return self.first <= days and (self.last is None or days <= self.last)


EVERY_LEAD = Lead(0, None)
LEADS = (EVERY_LEAD, Lead(0, 7), Lead(8, 30), Lead(31, 90), Lead(91, 180), Lead(181, None))
"""A week, a month, a quarter, half a year: what a desk reckons in."""


class Nearer(StrEnum):
    """What a comparison says."""

    FIELDFOLD = "fieldfold"
    RIVAL = "rival"
    NO_CLEAR_DIFFERENCE = "no clear difference"
