"""What a reader must be told beside every number, and when nothing may be published."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

from aggregator.inputs.contest import Contest, Silence
from aggregator.release.rounding import date_text
from aggregator.verdict import Verdict


@dataclass(frozen=True)
class Caution:
    """One caution: a short heading and the sentences under it."""

    heading: str
    text: str


CAUTIONS = (
    Caution(
        "Estimates, not results.",
        "Every figure is an estimate from published polls. The interval beside it is part of the figure.",
    ),
    Caution(
        "What polls cannot see.",
        "A late swing after the last fieldwork, an error that all houses share, and who in the end goes to "
        "vote are not in the polls. The intervals allow for them by assumption, not by measurement.",
    ),
    Caution(
        "A chance is not a share of the vote.",
        "A chance of 70 % to win means that in three cases of ten somebody else does.",
    ),
    Caution(
        "No margin of error in the strict sense.",
        "Most samples are not random. The intervals are statements of a model, and hold only if its "
        "assumptions do.",
    ),
    Caution(
        "A lean is a difference between houses.",
        "It says how a house's figures differ from the average of the houses. It proves neither fault nor "
        "intent; the average itself can be off.",
    ),
    Caution(
        "The law comes first.",
        "Many places ban or restrict publishing polls and estimates made from them before or during voting. "
        "Check the electoral law and the professional codes that apply where this is published.",
    ),
)

CHART_CAUTION = (
    "Estimates, not results: late swings, an error all houses share and turnout "
    "are beyond what polls can see."
)
"""The caution inside every chart."""


@dataclass(frozen=True)
class PublicationStatus:
    """Whether a release may leave the desk, and what it must say.

    Attributes
    ----------
    not_for_publication
        Whether any reason forbids it on the day of the run.
    reasons
        One sentence per reason.
    windows
        One sentence per silence window of the contest, past or to come.
    unpublished
        Polls in the fit that are not yet published.
    """

    not_for_publication: bool
    reasons: tuple[str, ...]
    windows: tuple[str, ...]
    unpublished: tuple[str, ...]

    @property
    def banner(self) -> str | None:
        """The line that marks a release not for publication; None where it may be published."""
        return "NOT FOR PUBLICATION. " + " ".join(self.reasons) if self.not_for_publication else None


def publication_status(
    contest: Contest, *, run_date: date, unpublished: Sequence[str] = ()
) -> PublicationStatus:
    """Hold the day of the run against the contest's silence windows, phase by phase.

    Parameters
    ----------
    contest
        Its ``[release]`` part lists the windows.
    run_date
        The day the run stands on. Windows are whole days in their own time zone; where the desk sits in
        another zone, the days at both ends need the desk's own judgement.
    unpublished
        Polls in the fit that are not yet published.
    """
    windows = contest.release.silence
    closed = [window for window in windows if window.from_ <= run_date <= window.until]
    reasons = [f"This run falls into a silence window: {_window_text(window, contest)}" for window in closed]
    if unpublished:
        count = len(unpublished)
        reasons.append(
            f"It uses {count} poll{'s' if count > 1 else ''} not yet published ({_listed(unpublished)}): "
            "the public half of this release was not written."
        )
    return PublicationStatus(
        not_for_publication=bool(reasons),
        reasons=tuple(reasons),
        windows=tuple(_window_text(window, contest) for window in windows),
        unpublished=tuple(unpublished),
    )


def failed_checks_text(verdict: Verdict) -> str | None:
    """Word what every table, chart and page says when checks failed; None where they passed."""
    if verdict.passed:
        return None
    failed = verdict.table.loc[~verdict.table["passed"].astype(bool), "check"].astype(str)
    return f"CHECKS FAILED ({_listed(list(failed))}): do not rely on or publish these figures"


def _listed(items: Sequence[str], *, most: int = 5) -> str:
    shown = ", ".join(items[:most])
    return shown if len(items) <= most else f"{shown}, … ({len(items)} in total)"


def _window_text(window: Silence, contest: Contest) -> str:
    names = {region.code: region.name for region in contest.regions}
    where = (
        "" if window.regions is None else " in " + ", ".join(names.get(code, code) for code in window.regions)
    )
    law = f" ({window.law})" if window.law else ""
    return (
        f"no publication{where} from the start of {date_text(window.from_)} "
        f"to the end of {date_text(window.until)}, {window.time_zone} time{law}."
    )
