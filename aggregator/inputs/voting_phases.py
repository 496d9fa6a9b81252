"""Voting in phases: what is done with fieldwork that outlasts a region's polling day."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from aggregator.inputs.contest import Contest
from aggregator.inputs.poll_breakdowns import rows_by_poll
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity


def check_phases(rows: Sequence[PollRow], *, contest: Contest, file: str) -> Iterator[Problem]:
    """Warn, once per poll, where some regions of a row that enters had voted when its fieldwork ended.

    The row is read as it stands: what people in those regions say is how they voted, so that the regions
    are taken as they stood on their polling day. Rows only about such regions do not come here unless the
    desk says so (``use`` = yes), which has a warning of its own.
    """
    for group in rows_by_poll(rows).values():
        for row in group:
            voted = [r for r in row.regions if contest.polling_day_of(r) <= row.end]
            if voted and len(voted) < len(row.regions):
                places = ", ".join(f"{r} ({contest.polling_day_of(r)})" for r in voted[:5])
                more = f", … ({len(voted)} in total)" if len(voted) > 5 else ""
                yield Problem(
                    file, row.row, "end", f"{row.end}, when {places}{more} had voted",
                    "fieldwork that ended before a region votes",
                    "It enters; a region that has voted is taken as it stood on its polling day.",
                    Rule.HAD_VOTED, Severity.WARNING,
                )  # fmt: skip
                break
