"""How far a run of many fits is, how long it will take, and what a larger one would."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from statistics import mean
from typing import Any


@dataclass(frozen=True)
class Pace:
    """How far a run is.

    Attributes
    ----------
    finished, total
        Fits that are there, and fits in all.
    found
        Of those finished, the ones an earlier run had left.
    workers
        Processes at work; 0 where none is needed.
    seconds_left
        Seconds to go, by the fits made so far; None before the first.
    """

    finished: int
    total: int
    found: int
    workers: int
    seconds_left: float | None


@dataclass(frozen=True)
class FitCosts:
    """What fits cost where they were made.

    Attributes
    ----------
    fits
        Number of fits measured.
    first_seconds
        Mean seconds of a fit that had to compile.
    next_seconds
        Mean seconds of a fit that used its worker's compilation again.
    sampling_part
        Part of the time (0–1) in which chains ran, over all fits.
    """

    fits: int
    first_seconds: float
    next_seconds: float
    sampling_part: float

    def seconds_for(self, fits: int, *, workers: int) -> float:
        """Seconds that many such fits of one contest would take, each worker compiling once."""
        rounds = math.ceil(fits / workers)
        return self.first_seconds + (rounds - 1) * self.next_seconds


def measure_costs(facts: Iterable[Mapping[str, Any]]) -> FitCosts:
    """Measure what fits cost, from the facts of their records.

    Raises
    ------
    ValueError
        If there are none.
    """
    seconds = [(bool(f["reused_compilation"]), f["seconds"]) for f in facts]
    if not seconds:
        raise ValueError("no fit was made")
    every = [s["all"] for _, s in seconds]
    first = [s["all"] for reused, s in seconds if not reused] or every
    # Where every fit compiled, what comes after the compilation tells best what the next ones will take.
    following = [s["all"] for reused, s in seconds if reused] or [s["all"] - s["build"] for _, s in seconds]
    return FitCosts(
        fits=len(seconds),
        first_seconds=mean(first),
        next_seconds=mean(following),
        sampling_part=sum(s["sampling"] for _, s in seconds) / sum(every),
    )


def words_for(seconds: float) -> str:
    """Say how long something takes, as people do: two figures at most."""
    if seconds < 90:
        return f"{max(round(seconds), 1)} s"
    minutes = round(seconds / 60)
    if minutes < 60:
        return f"{minutes} min"
    hours, rest = divmod(minutes, 60)
    return f"{hours} h {rest} min" if hours < 10 and rest else f"{round(minutes / 60)} h"
