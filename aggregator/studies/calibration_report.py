"""What a calibration found: pooled tables, and whether the method holds what it says."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from aggregator.replays.calibration import summarise_reliability
from aggregator.settings import RunSettings
from aggregator.studies.beside_honest import summarise_alarms, summarise_damage
from aggregator.studies.coverage import summarise_coverage, summarise_scores
from aggregator.studies.invented_elections import LONGEST_SILENCE, SHORTEST_SILENCE
from aggregator.studies.judged_elections import JudgedElections
from aggregator.studies.noticed import summarise_noticed
from aggregator.studies.places import KIND_WORDS, Quantity, gather_places, judge_all_places
from aggregator.studies.whitening import PooledErrors, pool_errors
from aggregator.verdict import Verdict
from data_demo.made_up_election import ElectionSize
from data_demo.made_up_violation import Violation

HONEST = "as_assumed"
"""Name of a study in which nothing goes wrong."""
FEWEST_ELECTIONS = 200
"""With fewer the pooled coverage of a right method strays by more than it is held to."""
STATED, TOLERANCE = 90, 2.5
"""90 % intervals of support are to hold the truth in 87.5 to 92.5 %."""
# Streams of random numbers of the report, drawn from the first seed.
BOOTSTRAP_STREAM, LOT_STREAM, DAMAGE_STREAM = 0, 1, 2


@dataclass(frozen=True)
class CalibrationPlan:
    """What is studied.

    Attributes
    ----------
    elections, first_seed
        How many elections, and the seed of the first; the others follow one by one.
    size
        How large and untidy they are.
    violation
        What goes wrong in them that the model knows nothing of; None for nothing.
    settings
        Length of each fit. Its seed is the election's.
    """

    elections: int
    first_seed: int
    size: ElectionSize
    violation: Violation | None
    settings: RunSettings

    @property
    def seeds(self) -> range:
        """Seeds of the elections."""
        return range(self.first_seed, self.first_seed + self.elections)

    @property
    def name(self) -> str:
        """What the study is called: its violation, or that there is none."""
        return HONEST if self.violation is None else self.violation.name

    @property
    def size_text(self) -> str:
        """The size in words."""
        size = self.size
        return (
            f"{size.parties} parties and others, {size.regions} regions, {size.seats} seats, {size.houses} "
            f"houses with {size.polls} polls in {size.polled_weeks} weeks, none in the last "
            f"{SHORTEST_SILENCE} to {LONGEST_SILENCE} days"
        )


@dataclass(frozen=True)
class CalibrationReport:
    """What a calibration found.

    Attributes
    ----------
    plan
        What was studied.
    study
        Every election by itself.
    coverage, scores
        Pooled intervals, errors and scores, by group.
    places
        Places of the truth by kind of number: one row per election, one column per party.
    uniformity
        Those places against their simultaneous bands.
    reliability
        Chances of seats in bins, and how many came true.
    errors
        Whitened errors of the country, pooled.
    noticed
        What the program said about how many elections.
    damage, alarms
        What the violation broke, and what the program said more often because of it; None without one.
    verdict
        Whether the method holds what it says; None where that is not asked (a violation), or cannot be told
        (too few elections).
    """

    plan: CalibrationPlan
    study: JudgedElections
    coverage: pd.DataFrame
    scores: pd.DataFrame
    places: dict[str, pd.DataFrame]
    uniformity: pd.DataFrame
    reliability: pd.DataFrame
    errors: PooledErrors
    noticed: pd.DataFrame
    damage: pd.DataFrame | None
    alarms: pd.DataFrame | None
    verdict: Verdict | None


def build_report(
    plan: CalibrationPlan, study: JudgedElections, *, honest: JudgedElections | None = None
) -> CalibrationReport:
    """Pool the elections of a study.

    Parameters
    ----------
    honest
        The same elections without the violation; None where there is none.
    """
    coverage = summarise_coverage(study.judged, rng=_stream(plan, BOOTSTRAP_STREAM))
    places = gather_places(study.judged, rng=_stream(plan, LOT_STREAM))
    uniformity, errors = judge_all_places(places), pool_errors(study.errors)
    asked = plan.violation is None and plan.elections >= FEWEST_ELECTIONS
    return CalibrationReport(
        plan=plan,
        study=study,
        coverage=coverage,
        scores=summarise_scores(study.judged),
        places=places,
        uniformity=uniformity,
        reliability=summarise_reliability(study.chances),
        errors=errors,
        noticed=summarise_noticed(study.noticed, elections=len(study.fits)),
        damage=None if honest is None else summarise_damage(study, honest, rng=_stream(plan, DAMAGE_STREAM)),
        alarms=None if honest is None else summarise_alarms(study, honest),
        verdict=judge_calibration(coverage, uniformity, errors) if asked else None,
    )


def judge_calibration(coverage: pd.DataFrame, uniformity: pd.DataFrame, errors: PooledErrors) -> Verdict:
    """Hold pooled coverage, places of seats and whitened errors against what a right method would show."""
    support = coverage[(coverage["group"] == "all support") & (coverage["stated"] == STATED)]
    inside = float(support["inside"].item())
    seats = uniformity[uniformity["kind"] == KIND_WORDS[Quantity.SEATS]]
    low, high = errors.band
    rows = [
        (
            f"{STATED} % intervals of support that hold the truth, percent",
            round(inside, 1),
            f"{STATED - TOLERANCE:g} to {STATED + TOLERANCE:g}",
            abs(inside - STATED) <= TOLERANCE,
            "Stated uncertainty of support is too small (below) or too large (above).",
        ),
        (
            "parties whose seats lie outside the simultaneous band",
            int((~seats["inside"]).sum()),
            "0",
            bool(seats["inside"].all()),
            "Seats lean one way, or their intervals have a wrong width.",
        ),
        (
            "sum of squared whitened errors of the country",
            round(errors.chi_square, 1),
            f"{low:.1f} to {high:.1f}",
            errors.inside,
            "The errors of the parties together are larger (above) or smaller (below) than stated.",
        ),
    ]
    table = pd.DataFrame(rows, columns=["check", "value", "limit", "passed", "meaning"])
    passed = bool(table["passed"].all())
    failed = "; ".join(table.loc[~table["passed"], "check"])
    return Verdict(
        passed=passed,
        table=table,
        text="The method holds what it says on these elections."
        if passed
        else f"The method does not hold what it says on these elections: {failed}.",
    )


def _stream(plan: CalibrationPlan, number: int) -> np.random.Generator:
    return np.random.default_rng([plan.first_seed, number])
