"""All elections of a study, each judged against its truth."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from aggregator.replays.replayed_fit import ReplayedFit, has_passed
from aggregator.studies.invented_elections import InventedElection
from aggregator.studies.judged_fits import judge_fit, judge_whole_country, list_chances
from aggregator.studies.noticed import list_noticed

# Streams of random numbers beside the simulator's own.
PLACES_STREAM, SCREENS_STREAM = 11, 12


@dataclass(frozen=True)
class JudgedElections:
    """What a study's elections got right.

    Attributes
    ----------
    judged
        Every number against its truth; see :func:`aggregator.studies.judged_fits.judge_fit`.
    errors
        Whitened errors of national support on polling day, one array per election.
    chances
        Chance of every seat and party, and whether it came true.
    noticed
        What the program said about each; see :func:`aggregator.studies.noticed.list_noticed`.
    fits
        One row per election: ``election``, ``silent_days``, ``polls``, ``passed``, ``divergences``,
        ``chi_square`` and ``degrees`` of its whitened errors, ``brier`` (mean over its seats; blank without
        seats).
    facts
        Facts of every fit, what it cost among them.
    """

    judged: pd.DataFrame
    errors: tuple[npt.NDArray[np.float64], ...]
    chances: pd.DataFrame
    noticed: pd.DataFrame
    fits: pd.DataFrame
    facts: tuple[Mapping[str, Any], ...]


def judge_elections(pairs: Iterable[tuple[InventedElection, ReplayedFit]]) -> JudgedElections:
    """Judge every election and its fit; they may come one by one."""
    judged, errors, chances, noticed, fits, facts = [], [], [], [], [], []
    for election, fit in pairs:
        judged.append(judge_fit(election, fit, rng=np.random.default_rng([election.seed, PLACES_STREAM])))
        errors.append(judge_whole_country(election, fit))
        chances.append(list_chances(election, fit))
        noticed.append(
            list_noticed(election, fit, rng=np.random.default_rng([election.seed, SCREENS_STREAM]))
        )
        fits.append(_about_fit(election, fit, errors=errors[-1], chances=chances[-1]))
        facts.append(fit.facts)
    return JudgedElections(
        judged=pd.concat(judged, ignore_index=True),
        errors=tuple(errors),
        chances=pd.concat(chances, ignore_index=True),
        noticed=pd.concat(noticed, ignore_index=True),
        fits=pd.DataFrame(fits),
        facts=tuple(facts),
    )


def _about_fit(
    election: InventedElection,
    fit: ReplayedFit,
    *,
    errors: npt.NDArray[np.float64],
    chances: pd.DataFrame,
) -> dict[str, object]:
    squares = (chances["chance"] - chances["won"]) ** 2
    return {
        "election": election.seed,
        "silent_days": election.silent_days,
        "polls": int(election.inputs.polls["poll"].nunique()),
        "passed": has_passed(fit),
        "divergences": int(fit.facts["divergences"]),
        "chi_square": float((errors**2).sum()),
        "degrees": errors.size,
        "brier": squares.sum() / chances["seat"].nunique() if len(chances) else np.nan,
    }
