"""What a replay report says, gathered for page and charts: rounded tables, and how the codes look."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.release.chart_style import CodeLook, Frame, code_looks
from aggregator.release.codes import contest_codes
from aggregator.release.rounding import date_text, whole_text
from aggregator.release.table_columns import TableSchema
from aggregator.release.table_files import round_table
from aggregator.release.table_words import Level
from aggregator.replays.methods import Method, Quantity
from aggregator.replays.pooling import PooledReplays, pool_replays
from aggregator.replays.replay_cautions import CHART_CAUTION
from aggregator.replays.replay_schemas import (
    BY_SIZE,
    COMPARISONS,
    FITS,
    PLACES,
    RELIABILITY,
    SCORES,
    SEAT_SCORES,
    STALENESS,
    SUMMARY,
)
from aggregator.replays.replayed_fit import ReplayedFit, as_of, has_passed, in_order_of_dates
from aggregator.replays.result_shares import COUNTRY
from aggregator.replays.score_replay import ReplayScores


@dataclass(frozen=True)
class ReportContents:
    """Everything page and charts of a replay report are made from.

    Attributes
    ----------
    titles
        The contests.
    scores, seat_scores, reliability, places, summary, comparisons, staleness, by_size
        Rounded, as they are written.
    fits
        One row per replayed date; None where several contests are pooled.
    looks
        How codes are drawn; empty where several contests are pooled.
    """

    titles: tuple[str, ...]
    scores: pd.DataFrame
    seat_scores: pd.DataFrame
    reliability: pd.DataFrame
    places: pd.DataFrame
    summary: pd.DataFrame
    comparisons: pd.DataFrame
    staleness: pd.DataFrame
    by_size: pd.DataFrame
    fits: pd.DataFrame | None = None
    looks: tuple[CodeLook, ...] = ()
    levels: tuple[Level, ...] = ()

    def with_schemas(self) -> Iterator[tuple[TableSchema, pd.DataFrame]]:
        """Every table there is, with its schema; those about single seats only where seats are scored."""
        pairs = (
            (SCORES, self.scores),
            (SEAT_SCORES, self.seat_scores if len(self.seat_scores) else None),
            (RELIABILITY, self.reliability if len(self.reliability) else None),
            (PLACES, self.places),
            (SUMMARY, self.summary),
            (COMPARISONS, self.comparisons),
            (STALENESS, self.staleness),
            (BY_SIZE, self.by_size),
            (FITS, self.fits),
        )
        return ((schema, table) for schema, table in pairs if table is not None)

    @property
    def is_pooled(self) -> bool:
        """Whether several contests stand together."""
        return len(self.titles) > 1

    @property
    def title(self) -> str:
        """The contest, or how many there are."""
        return f"{len(self.titles)} contests" if self.is_pooled else self.titles[0]

    @property
    def days(self) -> list[pd.Timestamp]:
        """Replayed days, in order."""
        return sorted(pd.DatetimeIndex(self.scores["as_of"].unique()))

    @property
    def replays(self) -> int:
        """Replayed days over all contests."""
        return len(self.scores[["contest", "as_of"]].drop_duplicates())

    @property
    def rhythm(self) -> str:
        """How the replayed days follow each other: ``weekly``, ``four-weekly``, or nothing."""
        gaps = {(late - early).days for early, late in zip(self.days, self.days[1:], strict=False)}
        words = {1: "daily ", 7: "weekly ", 14: "fortnightly ", 28: "four-weekly "}
        return "" if self.is_pooled or len(gaps) != 1 else words.get(gaps.pop(), "")

    @property
    def has_seats(self) -> bool:
        """Whether seats were scored."""
        return bool((self.scores["quantity"] == Quantity.SEATS).any())

    @property
    def last_day(self) -> pd.DataFrame:
        """Rows of the program itself for the country on the last replayed day."""
        own = self.own
        return own[own["as_of"] == own["as_of"].max()]

    @property
    def own(self) -> pd.DataFrame:
        """Rows of the program itself for the country."""
        scores = self.scores
        return scores[(scores["method"] == Method.FIELDFOLD) & (scores["region"] == COUNTRY)]

    @property
    def failed_days(self) -> list[str]:
        """Days whose fit did not pass its checks."""
        if self.fits is None:
            return []
        return [date_text(day.date()) for day in self.fits.loc[self.fits["passed"] == "no", "as_of"]]

    @property
    def alarms(self) -> tuple[str, ...]:
        """What must be said before anything else; empty where all is well."""
        failed = self.failed_days
        if not failed:
            return ()
        listed = ", ".join(failed[:5]) + (", …" if len(failed) > 5 else "")
        fits = "fit" if len(failed) == 1 else "fits"
        return (
            f"CHECKS FAILED for {len(failed)} of {self.replays} {fits} ({listed}): their scores may be "
            "those of a sampler that did not finish, not of the model.",
        )

    @property
    def source_line(self) -> str:
        """What was replayed, in one line."""
        days = self.days
        span = f"{date_text(days[0].date())} to {date_text(days[-1].date())}"
        return (
            f"{self.title}. {whole_text(self.replays)} {self.rhythm}replays, {span}, held against the result."
        )

    @property
    def frame(self) -> Frame:
        """What stands around every chart."""
        return Frame(source=self.source_line, caution=CHART_CAUTION, alarms=self.alarms)


def contents_of_replay(
    scores: ReplayScores, *, records: Sequence[ReplayedFit], contest: Contest
) -> ReportContents:
    """Gather what the report of one contest says."""
    present = set(scores.scores["code"])
    codes = [code for code in contest_codes(contest) if code.code in present]
    looks = code_looks(contest_codes(contest))
    pooled = pool_replays([scores])
    return _contents(
        pooled,
        fits=list_fits(records),
        looks=tuple(looks[code.code] for code in codes),
        levels=tuple(code.level for code in codes),
    )


def contents_of_pool(pooled: PooledReplays) -> ReportContents:
    """Gather what the report of several contests says."""
    return _contents(pooled, fits=None)


def _contents(
    pooled: PooledReplays,
    *,
    fits: pd.DataFrame | None,
    looks: tuple[CodeLook, ...] = (),
    levels: tuple[Level, ...] = (),
) -> ReportContents:
    return ReportContents(
        titles=pooled.titles,
        scores=round_table(pooled.scores, schema=SCORES),
        seat_scores=round_table(pooled.seat_scores, schema=SEAT_SCORES),
        reliability=round_table(pooled.reliability, schema=RELIABILITY),
        places=round_table(pooled.places, schema=PLACES),
        summary=round_table(pooled.summary, schema=SUMMARY),
        comparisons=round_table(pooled.comparisons, schema=COMPARISONS),
        staleness=round_table(pooled.staleness, schema=STALENESS),
        by_size=round_table(pooled.by_size, schema=BY_SIZE),
        fits=None if fits is None else round_table(fits, schema=FITS),
        looks=looks,
        levels=levels,
    )


def list_fits(records: Sequence[ReplayedFit]) -> pd.DataFrame:
    """Tabulate what is known of each fit, in order of dates."""
    numbers = ("divergences", "worst_rhat", "least_tail_ess", "polls_used", "seed", "seconds")
    rows = []
    for fit in in_order_of_dates(records):
        facts = fit.facts
        last = facts.get("last_fieldwork")
        row: dict[str, object] = {name: _number(facts.get(name)) for name in numbers}
        row |= {
            "as_of": as_of(fit),
            "passed": "yes" if has_passed(fit) else "no",
            "verdict": str(facts.get("verdict") or ""),
            "last_fieldwork": pd.Timestamp(str(last)) if last else pd.NaT,
        }
        rows.append(row)
    table = pd.DataFrame(rows)[list(FITS.column_names)]
    return table.assign(last_fieldwork=pd.to_datetime(table["last_fieldwork"]))


def _number(value: object) -> float:
    if isinstance(value, (int, float, np.number)):
        return float(value)
    # Facts may hold parts, such as seconds by stage: then the whole.
    if isinstance(value, Mapping) and "all" in value:
        return float(value["all"])
    return float("nan")
