"""What a desk could say without a model, worked out by hand on small registers."""

from __future__ import annotations

from datetime import date

import numpy as np
import pandas as pd
import pytest

from aggregator.inputs.contest import Contest
from aggregator.replays.methods import Method
from aggregator.replays.result_shares import COUNTRY, seats_from_leads
from aggregator.replays.rivals import Rivals
from aggregator.replays.whole_polls import national_polls

DAY = pd.Timestamp("2033-04-01")
REGIONS = ("EAST", "WEST")


def contest(*, parties: tuple[str, ...] = ("FER", "LAN", "HED")) -> Contest:
    return Contest.model_validate(
        {
            "title": "Two Shores",
            "polling_day": date(2033, 5, 15),
            "party": [{"code": code, "name": code.title()} for code in parties],
            "alliance": [{"code": "GLOW", "name": "Glow", "members": ("LAN", "HED")}],
            "region": [{"code": code, "name": code.title()} for code in REGIONS],
            "last_result": {"date": date(2029, 5, 13)},
        }
    )


def last_result() -> pd.DataFrame:
    return pd.DataFrame(
        [
            ["E1", "E1", "EAST", 400, 300, 200, 100],
            ["E2", "E2", "EAST", 300, 420, 180, 100],
            ["W1", "W1", "WEST", 500, 250, np.nan, 250],
        ],
        columns=["seat", "name", "region", "FER", "LAN", "HED", "OTH"],
    )


def poll(
    name: str, *, published: str, regions: tuple[str, ...] = REGIONS, size: float = 1000, **shares: float
):
    end = pd.Timestamp(published) - pd.Timedelta(days=1)
    row = {
        "poll": name, "house": "Plumb Line", "start": end, "end": end, "published": pd.Timestamp(published),
        "regions": regions, "respondents": size, "remainder": shares.pop("remainder", np.nan),
    }  # fmt: skip
    return row | dict.fromkeys(("FER", "LAN", "HED", "OTH", "GLOW"), np.nan) | shares


def whole(name: str, fer: float, *, published: str, size: float = 1000, regions: tuple[str, ...] = REGIONS):
    return poll(name, published=published, size=size, regions=regions, FER=fer, LAN=60 - fer, HED=20, OTH=20)


def rivals(*rows: dict[str, object], last: pd.DataFrame | None = None) -> Rivals:
    return Rivals(pd.DataFrame(list(rows)), contest=contest(), last_result=last)


def test_a_poll_published_later_changes_no_rival():
    seen = whole("A", 40, published="2033-03-20")
    later = whole("B", 10, published="2033-04-02")
    alone, both = rivals(seen, last=last_result()), rivals(seen, later, last=last_result())
    for method, shares in alone.support(DAY).items():
        pd.testing.assert_frame_equal(both.support(DAY)[method], shares)
    for method, seats in alone.seats(DAY).items():
        pd.testing.assert_frame_equal(both.seats(DAY)[method], seats)


def test_the_latest_poll_is_the_last_published_one_whatever_the_order_of_the_register():
    rows = [whole("A", 40, published="2033-03-20"), whole("B", 30, published="2033-03-30")]
    for ordered in (rows, rows[::-1]):
        assert rivals(*ordered).support(DAY)[Method.LATEST_POLL].loc[COUNTRY, "FER"] == pytest.approx(0.30)


def test_the_plain_mean_takes_the_fieldwork_of_thirty_days_and_is_silent_without_any():
    old, fresh = whole("A", 20, published="2033-02-01"), whole("B", 30, published="2033-03-25")
    other = whole("C", 40, published="2033-03-26", size=9000)
    assert rivals(old, fresh, other).support(DAY)[Method.MEAN_30_DAYS].loc[COUNTRY, "FER"] == pytest.approx(
        0.35
    )
    assert Method.MEAN_30_DAYS not in rivals(old).support(DAY)


def test_in_the_decaying_mean_a_poll_thirty_days_older_and_twice_as_large_counts_the_same():
    fresh, old = whole("A", 40, published="2033-04-01"), whole("B", 20, published="2033-03-02", size=2000)
    assert rivals(fresh, old).support(DAY)[Method.DECAYING_MEAN].loc[COUNTRY, "FER"] == pytest.approx(0.30)


def test_an_alliance_and_a_remainder_are_split_by_the_last_result_within_the_lump():
    last = pd.Series({"FER": 0.4, "LAN": 0.3, "HED": 0.1, "OTH": 0.2})
    row = poll("A", published="2033-03-20", GLOW=44.0, remainder=56.0)
    shares = national_polls(pd.DataFrame([row]), contest=contest(), last=last).iloc[0]
    assert shares["LAN"] == pytest.approx(0.33) and shares["HED"] == pytest.approx(0.11)
    assert shares["FER"] == pytest.approx(0.56 * 4 / 6) and shares["OTH"] == pytest.approx(0.56 * 2 / 6)


def test_codes_without_a_remainder_keep_their_last_shares():
    last = pd.Series({"FER": 0.4, "LAN": 0.3, "HED": 0.1, "OTH": 0.2})
    row = poll("A", published="2033-03-20", FER=60.0, LAN=40.0)
    shares = national_polls(pd.DataFrame([row]), contest=contest(), last=last).iloc[0]
    assert shares[["HED", "OTH"]].tolist() == pytest.approx([0.1, 0.2])
    assert shares[["FER", "LAN"]].tolist() == pytest.approx([0.42, 0.28])


def test_a_poll_broken_down_by_all_regions_counts_once_as_their_mean():
    rows = [
        whole("A", 40, published="2033-03-20", size=300, regions=("EAST",)),
        whole("A", 20, published="2033-03-20", size=700, regions=("WEST",)),
        whole("B", 20, published="2033-03-20", size=700, regions=("WEST",)),
    ]
    polls = national_polls(pd.DataFrame(rows), contest=contest(), last=None)
    assert polls["poll"].tolist() == ["A"]
    assert polls["FER"].tolist() == pytest.approx([0.26])
    assert polls["respondents"].tolist() == [1000]


def test_uniform_swing_adds_the_countrys_change_to_every_seat():
    last = last_result()
    start = (
        last[["FER", "LAN", "HED", "OTH"]].fillna(0).sum() / last[["FER", "LAN", "HED", "OTH"]].sum().sum()
    )
    change = {"FER": -0.12, "LAN": 0.12, "HED": 0.0, "OTH": 0.0}
    row = poll("A", published="2033-03-20", **{c: 100 * (start[c] + change[c]) for c in change})
    seats = rivals(row, last=last).seats(DAY)
    # E1: FER .40 - .12 against LAN .30 + .12; W1: FER .50 - .12 against LAN .25 + .12: still FER.
    assert seats[Method.UNIFORM_SWING].idxmax(axis=1).to_dict() == {"E1": "LAN", "E2": "LAN", "W1": "FER"}
    assert seats[Method.LAST_RESULT].idxmax(axis=1).to_dict() == {"E1": "FER", "E2": "LAN", "W1": "FER"}


def test_a_regions_own_polls_give_its_swing_once_they_are_large_enough():
    national = whole("A", 39.0, published="2033-03-31")
    small = whole("B", 10.0, published="2033-03-31", regions=("EAST",), size=200)
    large = whole("B", 10.0, published="2033-03-31", regions=("EAST",), size=900)
    east = [
        rivals(national, own, last=last_result()).support(DAY)[Method.UNIFORM_SWING].loc["EAST", "FER"]
        for own in (small, large)
    ]
    assert east[1] == pytest.approx(0.10, abs=0.005)
    assert east[0] > 0.3


def test_seats_that_are_counted_are_taken_as_counted_from_the_day_of_the_count():
    early = contest()
    west = early.regions[1].model_copy(update={"counted": date(2033, 4, 1), "polling_day": date(2033, 3, 30)})
    early = early.model_copy(update={"regions": (early.regions[0], west)})
    counted = pd.DataFrame(
        [["W1", "W1", "WEST", 10, 20, np.nan, 900]],
        columns=["seat", "name", "region", "FER", "LAN", "HED", "OTH"],
    )
    said = Rivals(
        pd.DataFrame([whole("A", 40, published="2033-03-20")]),
        contest=early,
        last_result=last_result(),
        counted_result=counted,
    )
    before, after = (
        said.seats(day)[Method.UNIFORM_SWING].loc["W1"] for day in (DAY - pd.Timedelta(days=1), DAY)
    )
    assert (before.idxmax(), after.idxmax()) == ("FER", "OTH")


def test_without_a_last_result_only_rivals_made_of_polls_speak():
    said = rivals(whole("A", 40, published="2033-03-20"))
    assert set(said.support(DAY)) == {Method.LATEST_POLL, Method.MEAN_30_DAYS, Method.DECAYING_MEAN}
    assert said.seats(DAY) == {}


def test_before_the_first_poll_only_the_last_result_speaks():
    said = rivals(whole("A", 40, published="2033-04-20"), last=last_result())
    assert set(said.support(DAY)) == {Method.LAST_RESULT}


def test_leaders_with_equal_votes_share_the_seat_whatever_their_order():
    votes = pd.DataFrame([[5.0, 5.0, 1.0]], columns=["A", "B", "C"], index=["S"])
    assert seats_from_leads(votes).loc["S"].tolist() == [0.5, 0.5, 0.0]
    assert seats_from_leads(votes[["C", "B", "A"]]).loc["S"].to_dict() == {"A": 0.5, "B": 0.5, "C": 0.0}
