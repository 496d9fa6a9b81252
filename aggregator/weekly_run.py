"""The weekly refresh, start to finish: read, fit, count, weigh, screen, write."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import asdict, dataclass
from datetime import date
from pathlib import Path

import numpy as np
import pandas as pd

from aggregator.estimate.fit import Fit, fit_contest
from aggregator.inputs.contest import CountingRule
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.problems import Problem
from aggregator.release.folder import check_place_is_free
from aggregator.release.write_release import write_release
from aggregator.screens.screen_polls import screen_polls
from aggregator.seats.counting import count_seats
from aggregator.settings import RunSettings
from aggregator.shelf_life.worth import headline_code, polls_worth, summarise_shelf_life

# Streams of random numbers of their own, so that nothing else moves when the fit draws more.
SEATS_STREAM, SCREENS_STREAM = 2, 3


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
    seats = None
    if inputs.contest.counting.rule is not CountingRule.NONE and inputs.last_result is not None:
        progress("counting seats", 0.0)
        seats = count_seats(
            fit.draws,
            last_result=inputs.last_result,
            counted_result=inputs.counted_result,
            contest=inputs.contest,
            rng=np.random.default_rng([fit.settings.seed, SEATS_STREAM]),
        )
    progress("weighing the polls", 0.0)
    worth = _weigh_polls(inputs, fit)
    shelf_life = summarise_shelf_life(
        fit.draws,
        alliances=[a for a in inputs.contest.alliances if a.active_on(inputs.contest.polling_day)],
    )
    progress("writing the release", 0.0)
    written = write_release(
        inputs,
        draws=fit.draws,
        seats=seats,
        shelf_life=shelf_life,
        polls_worth=worth,
        screens=screen_polls(inputs, rng=np.random.default_rng([fit.settings.seed, SCREENS_STREAM])),
        verdict=fit.verdict,
        settings=_disclosed_settings(inputs, fit),
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


def _weigh_polls(inputs: DeskInputs, fit: Fit) -> pd.DataFrame:
    worth = polls_worth(fit.draws, inputs.polls, code=headline_code(fit.draws))
    return worth.assign(pareto_k=worth["poll"].map(fit.pareto_k))


def _disclosed_settings(inputs: DeskInputs, fit: Fit) -> dict[str, object]:
    """Settings that the note and the manifest state."""
    return {
        **asdict(fit.settings),
        "priors": asdict(fit.priors),
        "model": inputs.contest.model.model_dump(mode="json"),
    }
