"""What a replay needs to know of the fit of one date."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any, Protocol

import pandas as pd
import xarray as xr


class ReplayedFit(Protocol):
    """The record of one fit; whoever runs fits hands these over.

    ``data`` holds ``national_support_polling_day`` (draw, party), ``support_polling_day`` (draw, region,
    party), both shares 0–1, ``expected_error`` (age, code) in points; where seats are counted also
    ``seats_polling_day`` (draw, party) and ``seat_chance`` (seat, party). ``facts`` holds ``as_of`` and what
    is known of the fit.
    """

    @property
    def key(self) -> str:
        """Name of the fit."""

    @property
    def data(self) -> xr.Dataset:
        """Its draws."""

    @property
    def facts(self) -> Mapping[str, Any]:
        """What is known of it."""


def as_of(fit: ReplayedFit) -> pd.Timestamp:
    """Day a fit stands on."""
    return pd.Timestamp(str(fit.facts["as_of"]))


def in_order_of_dates(fits: Iterable[ReplayedFit]) -> list[ReplayedFit]:
    """Sort fits by the day they stand on, whatever order they came in."""
    return sorted(fits, key=lambda fit: (as_of(fit), fit.key))


def has_passed(fit: ReplayedFit) -> bool:
    """Tell whether a fit's checks passed; from a file it may come back as a number."""
    return bool(fit.facts["passed"])
