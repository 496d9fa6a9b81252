"""The sentences a release opens with: templates filled with numbers from its tables.

Three phrases are kept apart. "On these polls" is about what the polls show and how much they are worth; "if
people voted on DATE" is about support on that day; "on polling day" is about when people do vote.
"""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.release.codes import Code, contest_codes
from aggregator.release.likelihood_words import NAMED_LEADER_FROM
from aggregator.release.rounding import chance_text, date_text, share_interval_text, share_text, whole_text
from aggregator.release.table_schemas import Kind, Level, Outcome
from aggregator.release.tables import ReleaseTables

MONTH_DAYS = 30
POLL_SIZE = 1_000


@dataclass(frozen=True)
class Headlines:
    """The opening sentences, in order: support, seats (or the lead), worth of a poll."""

    support: str
    seats: str
    worth: str

    @property
    def sentences(self) -> tuple[str, str, str]:
        """All of them."""
        return (self.support, self.seats, self.worth)


def build_headlines(
    tables: ReleaseTables, *, contest: Contest, chamber: int | None, majority: int | None
) -> Headlines:
    """Write the three opening sentences.

    No leader is named when its chance of leading is below "likely" (66 %).

    Parameters
    ----------
    tables
        The release's rounded tables; every number of a sentence stands in them.
    contest
        Names and polling day.
    chamber, majority
        Seats in the chamber and seats that make a majority; None where nothing is counted in seats.
    """
    return Headlines(
        support=_support_sentence(tables, contest),
        seats=(
            _lead_sentence(tables, contest)
            if tables.seats is None or chamber is None or majority is None
            else _seats_sentence(tables, tables.seats, contest, chamber, majority)
        ),
        worth=_worth_sentence(tables, contest),
    )


def largest_code(support: pd.DataFrame, *, kind: Kind) -> str:
    """Party with most support in the country, by its mean: on the day of the run, or on polling day."""
    return str(national_parties(support, kind=kind)["code"].iloc[0])


def national_parties(support: pd.DataFrame, *, kind: Kind) -> pd.DataFrame:
    """Rows of the parties (not of others) in the country on the last date of a kind, most support first."""
    rows = support[(support["region"] == "") & (support["kind"] == kind) & (support["level"] == Level.PARTY)]
    return rows[rows["date"] == rows["date"].max()].sort_values("mean", ascending=False, kind="stable")


def chance_of(chances: pd.DataFrame, outcome: Outcome, *, kind: Kind, code: str | None = None) -> pd.Series:
    """The row of one chance on the last date of a kind; the likeliest code where none is named."""
    rows = chances[(chances["outcome"] == outcome) & (chances["kind"] == kind)]
    rows = rows[rows["date"] == rows["date"].max()]
    if code is not None:
        rows = rows[rows["code"] == code]
    return rows.loc[rows["probability"].idxmax()]


def _support_sentence(tables: ReleaseTables, contest: Contest) -> str:
    names = contest.party_names
    rows = national_parties(tables.support, kind=Kind.ON_POLLING_DAY)
    lead = chance_of(tables.chances, Outcome.MOST_SUPPORT, kind=Kind.ON_POLLING_DAY)
    when = f"On polling day, {date_text(contest.polling_day)},"
    if lead["probability"] >= NAMED_LEADER_FROM:
        row = rows[rows["code"] == lead["code"]].iloc[0]
        return (
            f"{when} {names[lead['code']]} is {lead['likelihood']} ({chance_text(lead['probability'])}) to have the most "
            f"support: {_share_and_interval(row)}."
        )
    first, second = rows.iloc[0], rows.iloc[1]
    return (
        f"{when} no party is likely to have the most support: {names[first['code']]} stands at "
        f"{_share_and_interval(first)}, {names[second['code']]} at {_share_and_interval(second, named=False)}."
    )


def _share_and_interval(row: pd.Series, *, named: bool = True) -> str:
    label = "90 % interval " if named else ""
    return f"{share_text(row['mean'])} of the vote ({label}{share_interval_text(row['q05'], row['q95'])})"


def _lead_sentence(tables: ReleaseTables, contest: Contest) -> str:
    """For a contest without seats: who would lead if people voted on the day of the run."""
    names = contest.party_names
    rows = national_parties(tables.support, kind=Kind.ON_DATE)
    day = date_text(rows["date"].iloc[0].date())
    lead = chance_of(tables.chances, Outcome.MOST_SUPPORT, kind=Kind.ON_DATE)
    first, second = rows.iloc[0], rows.iloc[1]
    if lead["probability"] >= NAMED_LEADER_FROM:
        return (
            f"If people voted on {day}, {names[lead['code']]} would be {lead['likelihood']} "
            f"({chance_text(lead['probability'])}) to lead; next is {names[(second if lead['code'] == first['code'] else first)['code']]}."
        )
    return f"If people voted on {day}, neither {names[first['code']]} nor {names[second['code']]} would be likely to lead."


def _seats_sentence(
    tables: ReleaseTables, seats: pd.DataFrame, contest: Contest, chamber: int, majority: int
) -> str:
    names = {code.code: code.name for code in contest_codes(contest)}
    rows = seats[(seats["kind"] == Kind.ON_POLLING_DAY) & (seats["level"] == Level.PARTY)]
    rows = rows.sort_values("mean", ascending=False, kind="stable")
    first, second = rows.iloc[0], rows.iloc[1]
    largest = chance_of(tables.chances, Outcome.LARGEST, kind=Kind.ON_POLLING_DAY)
    if largest["probability"] >= NAMED_LEADER_FROM:
        row = rows[rows["code"] == largest["code"]].iloc[0]
        opening = (
            f"On polling day {names[largest['code']]} is {largest['likelihood']} ({chance_text(largest['probability'])}) to "
            f"win the most seats: {_seats_and_interval(row)} of {whole_text(chamber)}"
        )
    else:
        opening = (
            f"On polling day no party is likely to win the most seats: {names[first['code']]} is expected to win "
            f"{_seats_and_interval(first)} of {whole_text(chamber)}, {names[second['code']]} {_seats_and_interval(second, named=False)}"
        )
    return f"{opening}; {_majority_clause(tables.chances, names, majority, contest_codes(contest))}."


def _majority_clause(
    chances: pd.DataFrame, names: dict[str, str], majority: int, codes: tuple[Code, ...]
) -> str:
    alone = chance_of(chances, Outcome.MAJORITY_ALONE, kind=Kind.ON_POLLING_DAY)
    clause = (
        f"that {names[alone['code']]} alone has a majority ({whole_text(majority)}) is {alone['likelihood']} "
        f"({chance_text(alone['probability'])})"
    )
    there = set(chances.loc[(chances["kind"] == Kind.ON_POLLING_DAY), "code"])
    if any(code.level is Level.ALLIANCE and code.code in there for code in codes):
        together = chance_of(chances, Outcome.MAJORITY_ONLY_AS_ALLIANCE, kind=Kind.ON_POLLING_DAY)
        clause += (
            f", and that only the {names[together['code']]} together has one is {together['likelihood']} "
            f"({chance_text(together['probability'])})"
        )
    return clause


def _seats_and_interval(row: pd.Series, *, named: bool = True) -> str:
    label = "90 % interval " if named else ""
    return f"{whole_text(row['mean'])} seats ({label}{whole_text(row['q05'])} to {whole_text(row['q95'])})"


def _worth_sentence(tables: ReleaseTables, contest: Contest) -> str:
    code = largest_code(tables.support, kind=Kind.ON_DATE)
    rows = tables.shelf_life[tables.shelf_life["code"] == code]
    row = rows.loc[(rows["age_days"] - MONTH_DAYS).abs().idxmin()]
    age = int(row["age_days"])
    ago = "a month ago" if 28 <= age <= 31 else f"{age} days ago"
    return (
        f"On these polls, a poll of {whole_text(POLL_SIZE)} taken {ago} now tells as much about {contest.party_names[code]} as "
        f"{whole_text(row['worth_today'])} people asked today."
    )
