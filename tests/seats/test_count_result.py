"""A known result counted by the contest's rules, against counts by hand."""

from __future__ import annotations

import pandas as pd
import pytest

from aggregator.seats.count_result import count_result, votes_say_seats
from tests.made_up_draws import made_up_last_result
from tests.seats.test_counting_rules import DHONDT, contest_with, with_members

COLUMNS = ["seat", "name", "region", "FER", "LAN", "HED", "TID", "OTH", "seats", "cluster"]


def test_plurality_gives_each_seat_to_its_leader() -> None:
    votes = with_members(made_up_last_result(), 1)
    counted = count_result(votes, contest=contest_with({"rule": "plurality"}))
    parties = ["FER", "LAN", "HED", "TID", "OTH"]
    leader = votes[parties].idxmax(axis=1).value_counts()
    assert counted["seats"].to_series().loc[parties].tolist() == [leader.get(p, 0) for p in parties]
    assert int(counted["ties"]) == 0


def test_compensatory_chamber_by_hand() -> None:
    """Three local seats, all of FER; with five from lists, eight by D'Hondt of 50:30:20 are 4-2-2 or 4-3-1.

    Quotients: FER 50, 25, 16.7, 12.5, 10; LAN 30, 15, 10; HED 20, 10. The eighth is the tie of three tens,
    so votes are 51, 30, 19: FER 51, 25.5, 17, 12.75, 10.2; LAN 30, 15, 10; HED 19, 9.5: 5-2-1.
    """
    votes = pd.DataFrame(
        [
            ["S1", "", "SKERRY", 20, 15, 0, 0, 0, 1, ""],
            ["D1", "", "DOWNS", 17, 8, 10, 0, 0, 1, ""],
            ["P1", "", "PORT", 14, 7, 9, 0, 0, 1, ""],
        ],
        columns=COLUMNS,
    )
    counted = count_result(votes, contest=contest_with({"rule": "mixed_compensatory", "list_seats": 5}))
    assert counted["seats"].to_series()[["FER", "LAN", "HED"]].tolist() == [5, 2, 1]
    assert counted["won"].sum("seat").to_series()["FER"] == 3


def test_a_tie_that_a_lot_must_decide_is_said() -> None:
    votes = pd.DataFrame(
        [["D1", "", "PORT", 100, 100, 0, 0, 0, 1, ""], ["D2", "", "DOWNS", 5, 3, 1, 0, 0, 1, ""],
         ["D3", "", "SKERRY", 5, 3, 0, 0, 0, 1, ""]],
        columns=COLUMNS,
    )  # fmt: skip
    assert int(count_result(votes, contest=contest_with(DHONDT))["ties"]) == 1


def test_a_first_round_does_not_say_who_won() -> None:
    contest = contest_with({"rule": "two_round"})
    assert not votes_say_seats(contest)
    with pytest.raises(ValueError, match="first round"):
        count_result(with_members(made_up_last_result(), 1), contest=contest)
