"""What a single row of the register must satisfy, whatever the other rows say."""

from __future__ import annotations

from collections.abc import Iterator

from aggregator.inputs.contest import Contest
from aggregator.inputs.poll_row import PollRow
from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.register_columns import Question, Status, Use
from aggregator.problems import Problem

# Questions about other ballots than the coming one: an alliance may be imagined, a party need not stand.
_OTHER_BALLOTS = {Question.HYPOTHETICAL, Question.HEAD_TO_HEAD, Question.RECALL}

# Rounding and a typing slip of a point or two end well below; above it a column was read twice.
HIGHEST_SUM = 105.0


def check_poll_row(row: PollRow, *, file: str, contest: Contest) -> list[Problem]:
    """Find everything wrong with one row."""
    problems = [*_check_days(row, file), *_check_decision(row, file), *_check_status(row, file)]
    problems += _check_sample(row, file)
    if row.question is Question.SEATS_ONLY:
        return problems
    problems += _check_figures(row, file)
    problems += _check_partition(row, file, contest)
    if row.question not in _OTHER_BALLOTS:
        problems += _check_standing(row, file, contest)
    return problems


def _check_days(row: PollRow, file: str) -> Iterator[Problem]:
    if row.start > row.end:
        yield Problem(
            file, row.row, "start", row.start.isoformat(), f"the end ({row.end}) or a day before it",
            "Correct start or end.", Rule.FIELDWORK_ORDER,
        )  # fmt: skip
    if row.published < row.end:
        yield Problem(
            file, row.row, "published", row.published.isoformat(), f"the end ({row.end}) or later",
            "Correct published or end.", Rule.PUBLISHED_ORDER,
        )  # fmt: skip


def _check_decision(row: PollRow, file: str) -> Iterator[Problem]:
    if row.use is Use.NO and not row.why_not:
        yield Problem(
            file, row.row, "why_not", "a blank cell beside use = no", "the reason",
            "Say why the poll is left out: the release lists it.", Rule.USE,
        )  # fmt: skip
    if row.use is not Use.NO and row.why_not:
        yield Problem(
            file, row.row, "why_not", f'"{row.why_not}" without use = no', "a blank cell",
            "Write use = no, or move the text to note.", Rule.USE,
        )  # fmt: skip
    if row.use is Use.YES and row.question is not Question.VOTE:
        yield Problem(
            file, row.row, "use", f"yes for a {row.question} question", "blank or no",
            "Only vote questions enter; correct question or use.", Rule.USE,
        )  # fmt: skip


def _check_status(row: PollRow, file: str) -> Iterator[Problem]:
    reason = "replaces" if row.replaces else "withdrawn" if row.status is Status.WITHDRAWN else ""
    if reason and row.status_date is None:
        said = "replaces filled" if row.replaces else "status = withdrawn"
        yield Problem(
            file, row.row, "status_date", f"a blank cell beside {said}", "the day it was made known",
            "Enter it: the register is read as it stood on a day.", Rule.STATUS,
        )  # fmt: skip
    if row.replaces and row.replaces == row.poll:
        yield Problem(
            file, row.row, "replaces", f'"{row.replaces}", the row\'s own poll', "the poll it corrects",
            f'Give the correction an identifier of its own, such as "{row.poll}-corrected".', Rule.REPLACES,
        )  # fmt: skip
    if row.status is Status.WITHDRAWN and row.status_date is not None and row.status_date < row.published:
        yield Problem(
            file, row.row, "status_date", row.status_date.isoformat(),
            f"the day of publication ({row.published}) or later", "Correct either.", Rule.STATUS,
        )  # fmt: skip


def _check_sample(row: PollRow, file: str) -> Iterator[Problem]:
    if row.sample is not None and (row.sample < 1 or row.sample != round(row.sample)):
        yield Problem(
            file, row.row, "sample", f"{row.sample:g}", "a whole number of respondents, 1 or more",
            "Enter the number interviewed; a weighted base belongs in effective.", Rule.SAMPLE,
        )  # fmt: skip
    if row.effective is None:
        return
    if row.effective <= 0:
        yield Problem(
            file, row.row, "effective", f"{row.effective:g}", "a number above 0",
            "Correct it, or leave the cell blank.", Rule.EFFECTIVE,
        )  # fmt: skip
    elif row.sample is not None and row.effective > row.sample:
        yield Problem(
            file, row.row, "effective", f"{row.effective:g}", f"at most the sample ({row.sample:g})",
            "The effective size is the smaller of the two: correct one.", Rule.EFFECTIVE,
        )  # fmt: skip


def _check_figures(row: PollRow, file: str) -> Iterator[Problem]:
    figures = dict(row.shares)
    if row.undecided is not None:
        figures["undecided"] = row.undecided
    wrong = {c: v for c, v in figures.items() if not 0 <= v <= 100}
    for column, value in wrong.items():
        yield Problem(
            file, row.row, column, f"{value:g}", "a percentage from 0 to 100", "Correct the figure.",
            Rule.SHARE_RANGE,
        )  # fmt: skip
    if len(row.shares) < 2:
        if row.wants_in:
            yield Problem(
                file, row.row, None, f"{len(row.shares)} figure(s)", "shares for two codes or more",
                "Enter the shares, or set use = no and say why.", Rule.TOO_FEW_CODES,
            )  # fmt: skip
        return
    if wrong:
        return
    total = sum(row.shares.values())
    if total <= 1.5 and row.wants_in:
        yield Problem(
            file, row.row, None, f"shares that sum to {total:.6g}", "percentages, that sum to about 100",
            "Multiply the shares by 100; a workbook's percent format stores 0.34 for 34 %.",
            Rule.SHARE_FRACTION,
        )  # fmt: skip
    elif total > HIGHEST_SUM:
        yield Problem(
            file, row.row, None, f"shares that sum to {total:.6g}", f"at most {HIGHEST_SUM:g}",
            "Look for a slip, or for a figure entered in two columns.", Rule.SUM_OVER,
        )  # fmt: skip


def _check_partition(row: PollRow, file: str, contest: Contest) -> Iterator[Problem]:
    """Check that no party's support stand in two filled columns."""
    holder: dict[str, str] = {}
    for code in row.shares:
        for member in contest.members_of(code):
            earlier = holder.setdefault(member, code)
            if earlier != code:
                yield Problem(
                    file, row.row, code, f"{row.shares[code]:g}, while {earlier} is filled in too",
                    f"one of the two: both count {member}", f"Empty {code} or {earlier}.", Rule.COUNTED_TWICE,
                )  # fmt: skip


def _check_standing(row: PollRow, file: str, contest: Contest) -> Iterator[Problem]:
    alliances = {a.code: a for a in contest.alliances}
    for code, share in row.shares.items():
        alliance = alliances.get(code)
        if alliance is not None and not (
            (alliance.from_ is None or alliance.from_ <= row.end)
            and (alliance.until is None or row.start <= alliance.until)
        ):
            yield Problem(
                file, row.row, code, f"{share:g} for fieldwork from {row.start} to {row.end}",
                f"a blank cell: the alliance exists from {alliance.from_ or '…'} to {alliance.until or '…'}",
                "Enter its members instead, or correct from and until in contest.toml.", Rule.ALLIANCE_PERIOD,
            )  # fmt: skip
        stands = any(contest.stands_in(m, r) for m in contest.members_of(code) for r in row.regions)
        if share > 0 and not stands:
            yield Problem(
                file, row.row, code, f"{share:g} in {'+'.join(row.regions)}",
                f"a blank cell or 0: {code} stands in none of these regions",
                "Correct the region, the figure, or the party's regions in contest.toml.", Rule.NOT_STANDING,
            )  # fmt: skip
