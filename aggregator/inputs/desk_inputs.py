"""Everything a run knows, after all files were read and checked."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from pathlib import Path

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.fingerprints import Fingerprint
from aggregator.problems import Problem


@dataclass(frozen=True)
class DeskInputs:
    """The checked files of a contest folder, as they stood on one day.

    Attributes
    ----------
    folder
        The contest folder.
    contest
        The contest, its counting rule, seats and majority filled in.
    run_date
        The day the run stands on: estimates "today" are for this day.
    polls
        Poll rows that enter the fit, in register order. Columns: ``row`` (spreadsheet row), ``poll``,
        ``house``, ``sponsor``, ``start``, ``end``, ``published`` (``datetime64``), ``regions`` (tuple of
        region codes, all of them for a national row), ``sample`` (respondents of this row, as reported),
        ``respondents`` (of this row, after undecided were set aside), ``poll_respondents`` (of the whole
        poll, its rows counted once), ``effective`` (NaN where not given), ``mode``, ``population``,
        ``method``, ``undecided`` (percent, NaN where blank), ``rounding_step`` (of the shares, in percent
        after rescaling), ``source``, ``note``, then one column per
        party and alliance code: percent, NaN where blank, rescaled so that undecided are left out.
        ``remainder``: percent left for all codes not asked, NaN where the row has no remainder to read
        (the shares are then read as shares among the codes given).
    unused_polls
        Poll rows that do not enter, as read, with the column ``why_not``.
    last_result
        Votes by party, one row per seat: columns ``seat``, ``name``, ``region``, ``seats`` (members the row
        elects; 0 where it elects none and the file does not say how many its region has), ``cluster``
        (neighbouring seats that move together; blank: none), then one per party code (votes as float, others
        included), splits and mergers already applied (``inherits``). NaN where the party did not stand, or
        had no column: not the same as 0 votes. Votes where a party does not stand any more are kept.
        ``seat`` is blank where the file has one row per region. None without a last result.
    counted_result
        Votes of the regions that have voted and been counted as of the run, columns as in ``last_result``;
        None where no region has.
    past_errors
        The desk's record of earlier elections, one row per election and party: ``election``
        (``datetime64``), ``code``, ``polled`` (final poll average) and ``result``, both percent. None without
        a record.
    before_last
        Votes of the election before the last, columns as in ``last_result``; None without one.
    transfers
        Where voters go in a run-off, one row per ordered pair of party codes: ``from``, ``to``, ``rate`` and
        ``sd``, percent of the voters of ``from``. None where nobody counts in two rounds.
    candidates
        Who stands at the coming election as of ``run_date``, one row per candidate in the order of the file:
        ``seat``, ``code``, ``name`` (blank where not given), ``holder`` (whether it is the sitting member). A
        seat that is not named has a full slate; in one that is, nobody else stands but others. None where
        nobody is listed.
    warnings
        What was doubtful; travels into the release.
    unpublished
        Identifiers of used polls whose publication day lies after ``run_date``.
    files
        Every file that was read, in a fixed order.
    fingerprints
        SHA-256 of the bytes that were read, in the same order.
    """

    folder: Path
    contest: Contest
    run_date: date
    polls: pd.DataFrame
    unused_polls: pd.DataFrame
    last_result: pd.DataFrame | None
    warnings: tuple[Problem, ...]
    unpublished: tuple[str, ...]
    files: tuple[Path, ...]
    fingerprints: tuple[Fingerprint, ...] = ()
    counted_result: pd.DataFrame | None = None
    past_errors: pd.DataFrame | None = None
    before_last: pd.DataFrame | None = None
    transfers: pd.DataFrame | None = None
    candidates: pd.DataFrame | None = None
