"""What the headline numbers would be had the run assumed something else."""

from __future__ import annotations

from dataclasses import dataclass

import xarray as xr


@dataclass(frozen=True)
class Alternative:
    """One setting of one assumption, and what follows from it.

    Attributes
    ----------
    assumption
        What is assumed, such as ``"size of the shared lean"``.
    setting
        Its setting, in words or as a number.
    in_use
        Whether the run itself stands on this setting.
    draws
        ``national_support_polling_day`` (chain, draw, party), ``support_polling_day`` (chain, draw, region,
        party) and ``turnout_weight`` (chain, draw, region) under the setting, every draw of the same weight;
        None where the draws at hand cannot say and the model would have to be fitted again.
    seats
        ``seats_polling_day`` (chain, draw, party) counted from those draws; None where nothing is counted.
    pareto_k
        Pareto shape of the weights that carry the run's draws over to this setting: above .7 they cannot.
    """

    assumption: str
    setting: str
    in_use: bool
    draws: xr.Dataset | None
    seats: xr.Dataset | None
    pareto_k: float
