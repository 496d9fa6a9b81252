"""How an invented chamber is filled by several rules, and how its voters move on in run-offs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd

ANYONE = ""
"""Stands for every party in a row of transfers that no row closer to the case overrules."""
PERCENT = 100.0


@dataclass(frozen=True)
class MadeUpTransfer:
    """Percent of a party's voters who vote for another one in a run-off, and how sure anyone is of it."""

    donor: str
    heir: str
    rate: float
    sd: float


@dataclass(frozen=True)
class MixedCounting:
    """A chamber filled by three rules, each in regions of its own.

    Most regions have seats won by the most votes, and together fill further seats from lists (Sainte-Laguë)
    so that all their seats are in proportion; where a party wins more than that the chamber grows until they
    are. Some elect several members in each district (D'Hondt), some one in two rounds.

    Attributes
    ----------
    list_seats
        Seats filled from lists in the regions that have both, before the chamber grows.
    threshold
        Percent of these regions' votes that a list needs to take part.
    exempt
        Parties that need not pass it.
    by_district
        Regions whose districts elect several members.
    by_two_rounds
        Regions where a seat takes more than half the votes, or else a run-off between the first two.
    transfers
        Who votes for whom in a run-off when their own party is out of it.
    """

    list_seats: int
    threshold: float
    exempt: tuple[str, ...]
    by_district: tuple[str, ...]
    by_two_rounds: tuple[str, ...]
    transfers: tuple[MadeUpTransfer, ...]


def transfer_table(counting: MixedCounting) -> pd.DataFrame:
    """Table of transfers as in ``transfers.csv``: from, to, rate, sd."""
    rows = [(t.donor, t.heir, t.rate, t.sd) for t in counting.transfers]
    return pd.DataFrame(rows, columns=["from", "to", "rate", "sd"])


def draw_transfers(
    counting: MixedCounting | None, *, codes: Sequence[str], rng: np.random.Generator
) -> pd.DataFrame:
    """Draw what part of each party's voters does move to each other one: from, to, rate (percent).

    The same in every seat, in tenths of a percent; no row where the most votes win every seat.
    """
    rows = []
    if counting is not None:
        for donor in codes:
            for heir in codes:
                if donor != heir:
                    usual = closest_transfer(counting, donor=donor, heir=heir)
                    mean, sd = usual.rate / PERCENT, usual.sd / PERCENT
                    both = mean * (1 - mean) / sd**2 - 1
                    rate = rng.beta(mean * both, (1 - mean) * both)
                    rows.append((donor, heir, round(PERCENT * rate, 1)))
    return pd.DataFrame(rows, columns=["from", "to", "rate"])


def closest_transfer(counting: MixedCounting, *, donor: str, heir: str) -> MadeUpTransfer:
    """Row that holds for a pair: its own, else the donor's, else the heir's, else everyone's.

    Raises
    ------
    ValueError
        Where no row covers the pair.
    """
    named = {(t.donor, t.heir): t for t in counting.transfers}
    for pair in ((donor, heir), (donor, ANYONE), (ANYONE, heir), (ANYONE, ANYONE)):
        if pair in named:
            return named[pair]
    raise ValueError(f"No row of transfers covers {donor} to {heir}.")
