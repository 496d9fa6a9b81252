"""The weekly refresh, start to finish: read, fit, count, weigh, screen, write."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import asdict, dataclass, replace
from datetime import date
from functools import partial
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr
from threadpoolctl import threadpool_limits

from aggregator.alternatives import Alternative
from aggregator.estimate.fit import Fit, fit_contest
from aggregator.estimate.lean_alternatives import lean_alternatives
from aggregator.estimate.lean_sizes import late_undecided
from aggregator.estimate.predictive_checks import summarise_predictive
from aggregator.estimate.prior_sensitivity import summarise_prior_sensitivity
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.problems import Problem
from aggregator.release.folder import check_place_is_free
from aggregator.release.model_checks import ModelChecks
from aggregator.release.write_release import write_release
from aggregator.screens.screen_polls import screen_polls
from aggregator.seats.desk_count import count_chamber_of, count_polling_day, prepare_chamber
from aggregator.seats.shifted_chamber import count_votes_to_seats
from aggregator.seats.swing_forms import SwingForm
from aggregator.settings import (
    LEAN_STREAM,
    PREDICTIVE_STREAM,
    PRIOR_STREAM,
    SCREENS_STREAM,
    SEATS_STREAM,
    RunSettings,
)
from aggregator.shelf_life.worth import headline_code, polls_worth, summarise_shelf_life
from models.priors import shared_lean_points

SWING = "how a region's move reaches its seats"


@dataclass(frozen=True)
class RefreshOutcome:
    """What a refresh left behind.

    Attributes
    ----------
    release
        The release folder.
    page
        Its page; in the desk's half where there is no public one.
    headlines
        The opening sentences.
    passed
        Whether the checks passed.
    warnings
        What was doubtful in the desk's files.
    notices
        What must be said aloud: failed checks, no publication.
    """

    release: Path
    page: Path
    headlines: tuple[str, ...]
    passed: bool
    warnings: tuple[Problem, ...]
    notices: tuple[str, ...]


def refresh(
    folder: Path,
    *,
    as_of: date | None = None,
    out: Path | None = None,
    settings: RunSettings | None = None,
    today: date,
    progress: Callable[[str, float], None] = lambda _stage, _part: None,
) -> RefreshOutcome:
    """Refresh one contest: read its folder, fit the model, count seats, write a release.

    Parameters
    ----------
    folder
        The contest folder.
    as_of
        See the register as it stood on this day; such a run needs ``out``.
    out
        Where to put the release instead of ``releases/``.
    settings
        Length and seed of the run.
    today
        The calendar's day.
    progress
        Called with a stage's name and its finished part, 0–1.

    Raises
    ------
    InputError
        With every finding, if a file is wrong; nothing is written then.
    UsageError
        If the call cannot work, or ``out`` already holds something: said before the fit.
    MachineError
        If the machine failed; nothing is left behind then.
    """
    progress("reading the desk's files", 0.0)
    inputs = read_contest_folder(folder, as_of=as_of, today=today)
    if out is not None:
        check_place_is_free(out)
    fit = fit_contest(inputs, settings=settings or RunSettings(), progress=progress)
    progress("counting seats", 0.0)
    prepared = prepare_chamber(inputs, draws=fit.draws, rng=_stream(fit, SEATS_STREAM))
    seats = None if prepared is None else count_chamber_of(inputs, prepared, draws=fit.draws)
    shifted = (
        None
        if prepared is None or seats is None
        else count_votes_to_seats(prepared, draws=fit.draws, seats=seats, contest=inputs.contest)
    )
    progress("weighing the polls", 0.0)
    worth = _weigh_polls(inputs, fit)
    voting = inputs.contest.last_polling_day
    shelf_life = summarise_shelf_life(
        fit.draws, alliances=[a for a in inputs.contest.alliances if a.active_on(voting)]
    )
    progress("testing the model", 0.0)
    checks = _test_model(inputs, fit, seats)
    progress("writing the release", 0.0)
    written = write_release(
        inputs,
        draws=fit.draws,
        seats=seats,
        shelf_life=shelf_life,
        polls_worth=worth,
        screens=screen_polls(inputs, rng=_stream(fit, SCREENS_STREAM)),
        verdict=fit.verdict,
        settings=_disclosed_settings(inputs, fit),
        shifted=shifted,
        checks=checks,
        out=out,
    )
    return RefreshOutcome(
        release=written.path,
        page=written.page,
        headlines=written.headlines.sentences,
        passed=fit.verdict.passed,
        warnings=inputs.warnings,
        notices=written.notices,
    )


def _test_model(inputs: DeskInputs, fit: Fit, seats: xr.Dataset | None) -> ModelChecks:
    """What informs about the fit and never fails it."""
    stream = partial(_stream, fit)
    with threadpool_limits(1):
        return ModelChecks(
            alternatives=(
                *(
                    _with_seats(alternative, inputs, fit, seats)
                    for alternative in lean_alternatives(inputs, fit, rng=stream(LEAN_STREAM))
                ),
                *_swing_alternatives(inputs, fit, seats),
            ),
            predictive=summarise_predictive(
                fit.parameters,
                arrays=fit.arrays,
                alliances=inputs.contest.alliances,
                rng=stream(PREDICTIVE_STREAM),
            ),
            prior_sensitivity=summarise_prior_sensitivity(
                fit.draws,
                seats=seats,
                positions=fit.positions,
                layout=fit.layout,
                parameters=fit.parameters,
                arrays=fit.arrays,
                priors=fit.priors,
                contest=inputs.contest,
                rng=stream(PRIOR_STREAM),
            ),
        )


def _stream(fit: Fit, number: int) -> np.random.Generator:
    return np.random.default_rng([fit.settings.seed, number])


def _with_seats(
    alternative: Alternative, inputs: DeskInputs, fit: Fit, seats: xr.Dataset | None
) -> Alternative:
    """Count the seats of another assumption; the run's own are those that the release shows."""
    if alternative.draws is None or alternative.in_use:
        return replace(alternative, seats=seats if alternative.in_use else None)
    counted = count_polling_day(inputs, draws=alternative.draws, rng=_stream(fit, SEATS_STREAM))
    return replace(alternative, seats=counted)


def _swing_alternatives(inputs: DeskInputs, fit: Fit, seats: xr.Dataset | None) -> Iterator[Alternative]:
    """Count the same draws with other ways for a region's move to reach its seats."""
    if seats is None or "won" not in seats:
        return
    names = ["national_support_polling_day", "support_polling_day", "turnout_weight"]
    draws = fit.draws[names]
    for form in SwingForm:
        in_use = form is SwingForm.LOG_RATIO
        counted = (
            seats
            if in_use
            else count_polling_day(inputs, draws=draws, rng=_stream(fit, SEATS_STREAM), form=form)
        )
        yield Alternative(SWING, form.value, in_use, draws, counted, 0.0)


def _weigh_polls(inputs: DeskInputs, fit: Fit) -> pd.DataFrame:
    worth = polls_worth(fit.draws, inputs.polls, code=headline_code(fit.draws))
    return worth.assign(pareto_k=worth["poll"].map(fit.pareto_k))


def _disclosed_settings(inputs: DeskInputs, fit: Fit) -> dict[str, object]:
    """Settings that the note and the manifest state."""
    return {
        **asdict(fit.settings),
        "shared_lean": _shared_lean(inputs, fit),
        "priors": asdict(fit.priors),
        "model": inputs.contest.model.model_dump(mode="json"),
    }


def _shared_lean(inputs: DeskInputs, fit: Fit) -> dict[str, object]:
    """Size of the error that all polls share, in points at 40 %, and what the undecided add to it."""
    undecided = late_undecided(inputs.polls)
    points = {
        code: shared_lean_points(float(size))
        for code, size in zip(fit.arrays.country.parties, fit.arrays.country.lean_size, strict=True)
    }
    most = max(points.values())
    added = shared_lean_points(undecided * fit.priors.undecided_stray)
    return {
        "points_at_40": points,
        "late_undecided": undecided,
        "undecided_adds": most - (most**2 - added**2) ** 0.5,
    }
