"""The priors of a run in words, each with its value: a table of the method note."""

from __future__ import annotations

from collections.abc import Mapping
from math import exp
from typing import NamedTuple


class PriorRow(NamedTuple):
    """One prior: the setting's name, its value as it is read, and what it is about."""

    setting: str
    value: str
    meaning: str


PRIOR_MEANINGS = {
    "drift_log_median": "how fast support moves in the country, per root of a week: median",
    "drift_log_sd": "… its spread, natural log",
    "region_ratio_median": "a region's own drift over the country's: median",
    "region_ratio_most": "… its upper limit",
    "region_ratio_spread": "… its spread, logit",
    "house_log_median": "how far houses lean apart: median",
    "house_log_sd": "… its spread, natural log",
    "era_part": "a way of working of one house: size of its lean, as a part of that of houses",
    "mode_part": "a mode of asking: the same",
    "population_part": "another population than the contest's: the same",
    "formation_part": "an alliance asked about as one: the same",
    "ramp_log_sd": "pace of opinion on polling day over its usual pace: spread around one, natural log",
    "party_spread": "how far one party's drift and leans stray from the common ones, natural log",
    "weighting_loss_log_median": "variance that weighting adds, over that of a random sample: median",
    "weighting_loss_log_sd": "… its spread for all houses together, natural log",
    "weighting_loss_spread": "… its spread between houses, natural log",
    "error_floor_log_median": "error that no sample size removes, as the part of p(1−p): median",
    "error_floor_log_sd": "… its spread for all houses together, natural log",
    "error_floor_spread": "… its spread between houses, natural log",
    "shared_lean": "standard deviation of the lean all houses share, log-support, times √p at share p",
    "lean_correlation": "correlation of that lean at the last result and on polling day",
    "region_lean_part": "the part of that lean that differs by region, as a part of the national one",
    "undecided_stray": "how far the undecided may break from those who chose, log-support, times √p",
    "free_log_sd": "a party without last votes: spread of its national start around the median, natural log",
    "free_region_log_sd": "… spread of its start in a region around the national one, natural log",
}
"""What each prior is about. A median is of a quantity that the model holds as its logarithm."""

LOG_MEDIAN = "_log_median"


def describe_priors(priors: Mapping[str, float]) -> list[PriorRow]:
    """Put a run's priors into words, in the order of the run.

    Parameters
    ----------
    priors
        Value of every prior by its name. Logarithms of medians are told as the medians themselves.

    Raises
    ------
    KeyError
        If a prior is not known here.
    """
    return [
        PriorRow(
            setting=name,
            value=f"{exp(value) if name.endswith(LOG_MEDIAN) else value:.3g}",
            meaning=PRIOR_MEANINGS[name],
        )
        for name, value in priors.items()
    ]
