"""The seats of an invented outcome, counted as a returning officer would: in fractions, one after another.

Slow on purpose, and plain: a faster count can be compared with this one. A tie has no answer here and stops
the count.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

import pandas as pd

from data_demo.made_up_counting import MixedCounting
from data_demo.made_up_scenery import OTHERS, Scenery

Votes = Mapping[str, Fraction]
Divisors = Literal["dhondt", "sainte_lague"]
Place = tuple[str, str, str, int]
"""Where, how, who, and how many seats."""
PLACE_COLUMNS = ["place", "how", "code", "seats"]
RUN_OFF_COLUMNS = ["seat", "code", "first_round", "run_off"]


@dataclass(frozen=True)
class SeatCount:
    """Who sits where.

    Attributes
    ----------
    seats
        Seats of the chamber by party.
    places
        One row per place and party with seats there: place (a seat or district, or "lists"), how
        (most_votes, first_round, run_off, district, lists), code, seats.
    run_offs
        One row per run-off and finalist: seat, code, first_round and run_off (votes).
    """

    seats: pd.Series
    places: pd.DataFrame
    run_offs: pd.DataFrame


@dataclass(frozen=True)
class Ballot:
    """Votes of one seat or district, and the members that it elects."""

    place: str
    region: str
    members: int
    votes: Votes


def count_chamber(votes: pd.DataFrame, *, scenery: Scenery, transfers: pd.DataFrame) -> SeatCount:
    """Count a whole chamber that is filled by several rules.

    Parameters
    ----------
    votes
        Votes by seat: columns seat, name, region, then the parties.
    transfers
        Percent of each party's voters who vote for each other one in a run-off: from, to, rate.

    Raises
    ------
    ValueError
        Where votes are tied, or the scenery has no such chamber.
    """
    counting = scenery.counting
    if counting is None:
        raise ValueError("The scenery names no rules by which its chamber is filled.")
    ballots = _ballots(votes, scenery=scenery)
    apart = counting.by_district + counting.by_two_rounds
    in_two_rounds, run_offs = _fill_in_two_rounds(
        [ballot for ballot in ballots if ballot.region in counting.by_two_rounds], transfers=transfers
    )
    places = pd.DataFrame(
        _fill_districts([ballot for ballot in ballots if ballot.region in counting.by_district])
        + _fill_mixed([ballot for ballot in ballots if ballot.region not in apart], counting=counting)
        + in_two_rounds,
        columns=PLACE_COLUMNS,
    )
    by_party = places.groupby("code")["seats"].sum().reindex(list(scenery.codes), fill_value=0)
    return SeatCount(
        seats=by_party.rename("seats").rename_axis("code"),
        places=places[places["seats"] > 0].reset_index(drop=True),
        run_offs=run_offs,
    )


def _ballots(votes: pd.DataFrame, *, scenery: Scenery) -> list[Ballot]:
    ballots = []
    for region in scenery.regions:
        rows = votes[votes["region"] == region.code].to_dict("records")
        for row, members in zip(rows, region.members_by_seat, strict=True):
            cast = {code: Fraction(int(row[code])) for code in scenery.codes}
            ballots.append(Ballot(str(row["seat"]), region.code, members, cast))
    return ballots


def _fill_districts(ballots: list[Ballot]) -> list[Place]:
    return [
        (ballot.place, "district", code, won)
        for ballot in ballots
        for code, won in share_out(
            without_others(ballot.votes), seats=ballot.members, divisors="dhondt"
        ).items()
    ]


def _fill_mixed(ballots: list[Ballot], *, counting: MixedCounting) -> list[Place]:
    winners = [most_votes(ballot.votes) for ballot in ballots]
    whole = {code: sum((b.votes[code] for b in ballots), Fraction(0)) for code in ballots[0].votes}
    from_lists = fill_from_lists(
        passing(whole, threshold=counting.threshold, exempt=counting.exempt),
        local={code: winners.count(code) for code in whole},
        seats=counting.list_seats,
    )
    local = [(ballot.place, "most_votes", code, 1) for ballot, code in zip(ballots, winners, strict=True)]
    return local + [("lists", "lists", code, won) for code, won in from_lists.items()]


def _fill_in_two_rounds(
    ballots: list[Ballot], *, transfers: pd.DataFrame
) -> tuple[list[Place], pd.DataFrame]:
    rates = {
        (str(donor), str(heir)): Fraction(str(rate)) / 100
        for donor, heir, rate in transfers.itertuples(index=False)
    }
    places, run_offs = [], []
    for ballot in ballots:
        winner, second = count_two_rounds(ballot.votes, rates=rates)
        places.append((ballot.place, "run_off" if second else "first_round", winner, 1))
        run_offs += [(ballot.place, code, ballot.votes[code], cast) for code, cast in second.items()]
    table = pd.DataFrame(run_offs, columns=RUN_OFF_COLUMNS)
    return places, table.astype({"first_round": float, "run_off": float})


def most_votes(votes: Votes) -> str:
    """Party with the most votes."""
    (first,) = most_of(votes, places=1)
    return first


def most_of(votes: Votes, *, places: int) -> list[str]:
    """Parties that share the most votes, where there is a place for each of them."""
    most = max(votes.values())
    first = [code for code, cast in votes.items() if cast == most]
    if len(first) > places:
        raise ValueError(f"Tied: {', '.join(first)}.")
    return first


def without_others(votes: Votes) -> dict[str, Fraction]:
    """Votes of lists: others are many small parties and no list."""
    return {code: cast for code, cast in votes.items() if code != OTHERS}


def share_out(votes: Votes, *, seats: int, divisors: Divisors) -> dict[str, int]:
    """Seats by party, one after another to the highest average.

    D'Hondt divides a list's votes by 1, 2, 3 and so on, Sainte-Laguë by 1, 3, 5.
    """
    won = dict.fromkeys(votes, 0)
    while (left := seats - sum(won.values())) > 0:
        averages = {
            code: cast / (won[code] + 1 if divisors == "dhondt" else 2 * won[code] + 1)
            for code, cast in votes.items()
        }
        for code in most_of(averages, places=left):
            won[code] += 1
    return won


def passing(votes: Votes, *, threshold: float, exempt: tuple[str, ...]) -> dict[str, Fraction]:
    """Votes of the lists that have the threshold's percent of all votes, others' included, or need not."""
    needed = Fraction(str(threshold)) / 100 * sum(votes.values())
    return {c: cast for c, cast in without_others(votes).items() if cast >= needed or c in exempt}


def fill_from_lists(votes: Votes, *, local: Mapping[str, int], seats: int) -> dict[str, int]:
    """Seats from lists, as many more than ``seats`` as bring all seats into proportion.

    Parameters
    ----------
    votes
        Votes of the lists that take part. Seats won locally by others stand outside the proportion.
    local
        Seats won locally, all parties.
    seats
        Seats filled from lists before the chamber grows.
    """
    size = seats + sum(local[code] for code in votes)
    while True:
        due = share_out(votes, seats=size, divisors="sainte_lague")
        if all(due[code] >= local[code] for code in votes):
            return {code: due[code] - local[code] for code in votes}
        size += 1


def count_two_rounds(
    votes: Votes, *, rates: Mapping[tuple[str, str], Fraction]
) -> tuple[str, dict[str, Fraction]]:
    """Winner of a seat, and the votes of its run-off: none where the first round gave more than half.

    In the run-off the first two keep their voters. Of each other party's voters each gets its part, and the
    rest stay at home; parts that sum to more than all voters are scaled down to them.
    """
    leader = most_votes(votes)
    if votes[leader] > sum(votes.values()) / 2:
        return leader, {}
    second = most_votes({code: cast for code, cast in votes.items() if code != leader})
    final = {leader: votes[leader], second: votes[second]}
    for donor, cast in votes.items():
        if donor not in (leader, second):
            parts = {heir: rates[donor, heir] for heir in (leader, second)}
            whole = max(Fraction(1), sum(parts.values(), Fraction(0)))
            for heir, part in parts.items():
                final[heir] += cast * part / whole
    return most_votes(final), final
