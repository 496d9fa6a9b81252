"""What one release says: tables, judgement and words, gathered for page, note and charts."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date

from aggregator.inputs.contest import Contest
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.release.cautions import CHART_CAUTION, PublicationStatus, failed_checks_text
from aggregator.release.chamber import Chamber
from aggregator.release.codes import Code, contest_codes
from aggregator.release.headlines import Headlines
from aggregator.release.rounding import date_text, whole_text
from aggregator.release.tables import ReleaseTables
from aggregator.verdict import Verdict


@dataclass(frozen=True)
class Pace:
    """How fast opinion moves on polling day, over its usual pace.

    Attributes
    ----------
    middle, low, high
        Median and ends of the 90 % interval.
    told
        How far the polls tell it: one minus posterior over prior variance, 0–1; None where not known.
    """

    middle: float
    low: float
    high: float
    told: float | None


@dataclass(frozen=True)
class ReleaseContents:
    """Everything page, note and charts are made from.

    Attributes
    ----------
    inputs
        The desk's checked files.
    tables
        Rounded, as they are written.
    verdict
        The judgement on the fit.
    status
        Whether the release may be published.
    settings
        Settings of the run.
    headlines
        The opening sentences.
    chamber
        The chamber and its majority line; None where nothing is counted in seats.
    list_seats
        Mean number of seats from lists by code, in a chamber that also fills seats locally; else None.
    pace
        How fast opinion moves towards the end; None where it runs evenly.
    """

    inputs: DeskInputs
    tables: ReleaseTables
    verdict: Verdict
    status: PublicationStatus
    settings: Mapping[str, object]
    headlines: Headlines
    chamber: Chamber | None
    list_seats: Mapping[str, float] | None = None
    pace: Pace | None = None

    @property
    def contest(self) -> Contest:
        """The contest."""
        return self.inputs.contest

    @property
    def run_date(self) -> date:
        """The day the run stands on."""
        return self.inputs.run_date

    @property
    def codes(self) -> tuple[Code, ...]:
        """All codes: parties, others, alliances."""
        return contest_codes(self.contest)

    @property
    def names(self) -> dict[str, str]:
        """Name of every code."""
        return {code.code: code.name for code in self.codes}

    @property
    def region_names(self) -> dict[str, str]:
        """Name of every region."""
        return {region.code: region.name for region in self.contest.regions}

    @property
    def caution(self) -> str | None:
        """What every table says when checks failed."""
        return failed_checks_text(self.verdict)

    @property
    def alarms(self) -> tuple[str, ...]:
        """Why the release must not be relied on or published; empty where all is well."""
        return tuple(text for text in (self.caution, self.status.banner) if text)

    @property
    def poll_count(self) -> int:
        """Polls in the fit."""
        return len(self.tables.polls_used)

    @property
    def respondents(self) -> int:
        """Respondents in the fit, each counted once."""
        return int(self.tables.polls_used["respondents"].sum())

    @property
    def house_count(self) -> int:
        """Houses in the fit."""
        return int(self.tables.polls_used["house"].nunique())

    @property
    def source_line(self) -> str:
        """Polls, fieldwork and the day of the run, in one line."""
        polls = self.tables.polls_used
        first = polls["start"].fillna(polls["end"]).min().date()
        publisher = f"{self.contest.release.publisher}, " if self.contest.release.publisher else ""
        return (
            f"{self.contest.title}. Source: {publisher}{_counted(self.poll_count, 'poll')} "
            f"by {_counted(self.house_count, 'house')}, {whole_text(self.respondents)} respondents, "
            f"fieldwork {date_text(first)} to {date_text(polls['end'].max().date())}; "
            f"run of {date_text(self.run_date)}; polling day {date_text(self.contest.last_polling_day)}."
        )

    @property
    def chart_caution(self) -> str:
        """The caution inside every chart, silence windows included."""
        return " ".join([CHART_CAUTION, *(f"By law: {window}" for window in self.status.windows)])


def _counted(number: int, noun: str) -> str:
    return f"{whole_text(number)} {noun}" + ("" if number == 1 else "s")
