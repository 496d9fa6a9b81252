"""The sentences a release opens with: templates filled with numbers from its tables.

Two statements are kept apart: "if people voted on DATE" is about support on that day, "on polling day" about
when people do vote. What a poll is worth is said of the day of the run.
"""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.release.chamber import Chamber
from aggregator.release.combination_words import combination_text, number_word
from aggregator.release.likelihood_words import NAMED_LEADER_FROM
from aggregator.release.rounding import chance_text, date_text, share_interval_text, share_text, whole_text
from aggregator.release.table_rows import largest_code, likeliest, national_parties
from aggregator.release.table_words import Kind, Level
from aggregator.release.tables import ReleaseTables
from aggregator.seats.majorities import Outcome

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


def build_headlines(tables: ReleaseTables, *, contest: Contest, chamber: Chamber | None) -> Headlines:
    """Write the three opening sentences.

    No leader is named when its chance of leading is below "likely" (66 %).

    Parameters
    ----------
    tables
        The release's rounded tables; every number of a sentence stands in them.
    contest
        Names and polling day.
    chamber
        The chamber and its majority line; None where nothing is counted in seats.
    """
    return Headlines(
        support=_support_sentence(tables, contest),
        seats=(
            _lead_sentence(tables, contest)
            if tables.seats is None or chamber is None
            else _seats_sentence(tables, tables.seats, contest, chamber)
        ),
        worth=_worth_sentence(tables, contest),
    )


def _support_sentence(tables: ReleaseTables, contest: Contest) -> str:
    names = contest.party_names
    rows = national_parties(tables.support, kind=Kind.ON_POLLING_DAY)
    lead = likeliest(tables.chances, Outcome.MOST_SUPPORT, kind=Kind.ON_POLLING_DAY)
    when = f"On polling day, {date_text(contest.last_polling_day)},"
    if lead["probability"] >= NAMED_LEADER_FROM:
        row = rows[rows["code"] == lead["code"]].iloc[0]
        return (
            f"{when} {names[lead['code']]} is {_worded(lead)} to have the most support: "
            f"{share_text(row['mean'])} of the vote (90 % interval {_shares(row)})."
        )
    first, second = rows.iloc[0], rows.iloc[1]
    return (
        f"{when} no party is likely to have the most support: {names[first['code']]} stands at "
        f"{share_text(first['mean'])} of the vote (90 % interval {_shares(first)}), "
        f"{names[second['code']]} at {share_text(second['mean'])} ({_shares(second)})."
    )


def _lead_sentence(tables: ReleaseTables, contest: Contest) -> str:
    """For a contest without seats: who would lead if people voted on the day of the run."""
    names = contest.party_names
    rows = national_parties(tables.support, kind=Kind.ON_DATE)
    lead = likeliest(tables.chances, Outcome.MOST_SUPPORT, kind=Kind.ON_DATE)
    opening = f"If people voted on {date_text(lead['date'].date())},"
    if lead["probability"] >= NAMED_LEADER_FROM:
        row = rows[rows["code"] == lead["code"]].iloc[0]
        return (
            f"{opening} {names[lead['code']]} would be {_worded(lead)} to lead, "
            f"with {share_text(row['mean'])} of the vote (90 % interval {_shares(row)})."
        )
    first, second = (names[code] for code in rows["code"].iloc[:2])
    return f"{opening} neither {first} nor {second} would be likely to lead."


def _seats_sentence(tables: ReleaseTables, seats: pd.DataFrame, contest: Contest, chamber: Chamber) -> str:
    """Say who is largest, and whether anyone reaches the majority line, alone or only together."""
    names = contest.party_names
    rows = seats[(seats["kind"] == Kind.ON_POLLING_DAY) & (seats["level"] == Level.PARTY)]
    rows = rows.sort_values("mean", ascending=False, kind="stable")
    largest = likeliest(tables.chances, Outcome.LARGEST, kind=Kind.ON_POLLING_DAY)
    every = ("the regular " if chamber.grows else "") + whole_text(chamber.regular)
    if largest["probability"] >= NAMED_LEADER_FROM:
        row = rows[rows["code"] == largest["code"]].iloc[0]
        opening = (
            f"On polling day {names[largest['code']]} is {_worded(largest)} to win the most seats: "
            f"{whole_text(row['mean'])} of {every} (90 % interval {_seats(row)})"
        )
        leader = largest["code"]
    else:
        first, second = rows.iloc[0], rows.iloc[1]
        opening = (
            "On polling day no party is likely to win the most seats: "
            f"{names[first['code']]} is expected to win {whole_text(first['mean'])} of {every} "
            f"(90 % interval {_seats(first)}), "
            f"{names[second['code']]} {whole_text(second['mean'])} ({_seats(second)})"
        )
        leader = None
    return f"{opening}. {_majority_sentence(tables, contest, chamber, leader=leader)}"


def _majority_sentence(
    tables: ReleaseTables, contest: Contest, chamber: Chamber, *, leader: str | None
) -> str:
    """Say how likely a majority is for the party nearest to it, and for those who have it only together.

    An alliance that the party belongs to is told as what the party falls back on: "a majority for the
    alliance" would be read as one beside the party's own.
    """
    alone = likeliest(tables.chances, Outcome.MAJORITY_ALONE, kind=Kind.ON_POLLING_DAY)
    party = "it" if alone["code"] == leader else contest.party_names[alone["code"]]
    of = f" ({chamber.majority_text})" if chamber.line_moves else f" of {whole_text(chamber.majority)}"
    opening = f"Alone, {party} is {_worded(alone)} to reach a majority{of}"
    alliances = {a.code: a for a in contest.alliances if a.active_on(contest.last_polling_day)}
    if not alliances:
        return f"{opening}{_fewest_together(tables, contest, alone=alone['probability'])}."
    together = likeliest(tables.chances, Outcome.MAJORITY_ONLY_AS_ALLIANCE, kind=Kind.ON_POLLING_DAY)
    alliance = alliances[together["code"]]
    if alone["code"] in alliance.members:
        return (
            f"{opening}; it is {_worded(together)} to fall short but get there "
            f"with its partners in {alliance.name}."
        )
    return (
        f"{opening}; {alliance.name} is {_worded(together)} to reach one "
        "with its members together, none of them alone."
    )


def _fewest_together(tables: ReleaseTables, contest: Contest, *, alone: float) -> str:
    """Name the fewest parties that reach the line together, where none is likely to alone."""
    if tables.combinations is None or alone >= NAMED_LEADER_FROM:
        return ""
    rows = tables.combinations[tables.combinations["kind"] == Kind.ON_POLLING_DAY]
    rows = rows[rows["parties"] > 1]
    if rows.empty:
        return ""
    fewest = rows[rows["parties"] == rows["parties"].min()]
    row = fewest.sort_values("chance", ascending=False, kind="stable").iloc[0]
    return (
        f"; of {number_word(row['parties'])} parties together, "
        f"{combination_text(row['combination'], contest.party_names)} are the likeliest to: "
        f"{row['likelihood']} ({chance_text(row['chance'])})"
    )


def _worth_sentence(tables: ReleaseTables, contest: Contest) -> str:
    code = largest_code(tables.support, kind=Kind.ON_DATE)
    rows = tables.shelf_life[tables.shelf_life["code"] == code]
    row = rows.iloc[int((rows["age_days"] - MONTH_DAYS).abs().argmin())]
    age = int(row["age_days"])
    ago = "a month ago" if 28 <= age <= 31 else f"{age} days ago"
    return (
        f"A poll of {whole_text(POLL_SIZE)} taken {ago} tells as much about support for "
        f"{contest.party_names[code]} now as {whole_text(row['worth_today'])} people asked today "
        f"(90 % interval {whole_text(row['worth_today_q05'])} to {whole_text(row['worth_today_q95'])})."
    )


def _worded(chance: pd.Series) -> str:
    return f"{chance['likelihood']} ({chance_text(chance['probability'])})"


def _shares(row: pd.Series) -> str:
    return share_interval_text(row["q05"], row["q95"])


def _seats(row: pd.Series) -> str:
    return f"{whole_text(row['q05'])} to {whole_text(row['q95'])}"
