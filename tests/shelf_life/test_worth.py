"""Tables of a poll's worth: sums of squares, order in age, levels, and polls of the register."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from aggregator.shelf_life.worth import (
    headline_code,
    polls_worth,
    summarise_half_life,
    summarise_shelf_life,
)
from tests.made_up_draws import calendar_clock, made_up_contest, made_up_draws

ALLIANCES = made_up_contest().alliances


def register(**columns: list[object]) -> pd.DataFrame:
    rows = {
        "poll": ["a", "b"],
        "house": ["Plumb Line", "Tally & Wick"],
        "start": pd.to_datetime(["2033-02-26", "2033-01-01"]),
        "end": pd.to_datetime(["2033-02-28", "2033-01-01"]),
        "respondents": [1000.0, 1500.0],
        "poll_respondents": [1000.0, 1500.0],
        "effective": [np.nan, np.nan],
    }
    return pd.DataFrame({**rows, **columns})


@pytest.fixture(scope="module")
def draws() -> xr.Dataset:
    return made_up_draws(draws=200)


@pytest.fixture(scope="module")
def table(draws: xr.Dataset) -> pd.DataFrame:
    return summarise_shelf_life(draws, sample=1000, ages=(0, 7, 28, 56), alliances=ALLIANCES)


def test_squares_of_the_causes_add_up_to_the_square_of_the_expected_error(table: pd.DataFrame) -> None:
    causes = table[["error_sampling", "error_house", "error_shared_lean", "error_drift"]]
    np.testing.assert_allclose((causes**2).sum(axis=1), table["expected_error"] ** 2)


def test_fresh_poll_is_worth_all_its_respondents_today_but_not_on_polling_day(table: pd.DataFrame) -> None:
    fresh = table[table["age_days"] == 0]
    np.testing.assert_allclose(fresh[["worth_today", "worth_today_q05", "worth_today_q95"]], 1000)
    assert (fresh["worth_polling_day"] < 1000).all()


def test_worth_falls_and_expected_error_rises_with_age(table: pd.DataFrame) -> None:
    for _, rows in table.groupby("code"):
        assert (rows["worth_today"].diff().dropna() < 0).all()
        assert (rows["worth_polling_day"].diff().dropna() < 0).all()
        assert (rows["expected_error"].diff().dropna() > 0).all()


def test_every_party_and_alliance_has_its_level_once_per_age(table: pd.DataFrame) -> None:
    levels = table[table["age_days"] == 7].set_index("code")["level"]
    assert levels["GLOW"] == "alliance"
    assert levels["OTH"] == "others"
    assert (levels.drop(["GLOW", "OTH"]) == "party").all()
    assert not table.duplicated(["age_days", "code"]).any()


def test_drift_to_polling_day_equals_age_plus_days_left_where_opinion_keeps_its_pace(
    draws: xr.Dataset,
) -> None:
    days_left = 70
    steady = calendar_clock(draws)
    early = summarise_shelf_life(steady, ages=(days_left,)).set_index("code")
    fresh = summarise_shelf_life(steady, ages=(0,)).set_index("code")
    np.testing.assert_allclose(early["worth_today"], fresh["worth_polling_day"])


def test_after_polling_day_nothing_more_drifts(draws: xr.Dataset) -> None:
    voted = draws.assign_attrs(polling_day="2033-03-01")
    fresh = summarise_shelf_life(voted, ages=(0,))
    np.testing.assert_allclose(fresh["worth_polling_day"], 1000)
    np.testing.assert_allclose(fresh["error_drift"], 0)


def test_jolt_between_fieldwork_and_today_ages_a_poll_by_its_weeks(draws: xr.Dataset) -> None:
    steady = calendar_clock(draws)
    after = steady["day"] >= np.datetime64("2033-02-20")
    jolted = steady.assign(opinion_clock=steady["opinion_clock"] + 4.0 * after)
    older = summarise_shelf_life(steady, ages=(21 + 28,)).set_index("code")
    younger = summarise_shelf_life(jolted, ages=(21,)).set_index("code")
    np.testing.assert_allclose(younger["worth_today"], older["worth_today"])
    spared = summarise_shelf_life(jolted, ages=(7,)).set_index("code")
    usual = summarise_shelf_life(steady, ages=(7,)).set_index("code")
    np.testing.assert_allclose(spared["worth_today"], usual["worth_today"])


def test_poll_taken_before_a_jolt_is_worth_less_than_its_calendar_age_says(draws: xr.Dataset) -> None:
    steady = calendar_clock(draws)
    after = steady["day"] >= np.datetime64("2033-02-20")
    jolted = steady.assign(opinion_clock=steady["opinion_clock"] + 4.0 * after)
    usual = polls_worth(steady, register(), code="FER").set_index("poll")["worth_today"]
    shaken = polls_worth(jolted, register(), code="FER").set_index("poll")["worth_today"]
    assert shaken["b"] < usual["b"]  # 1 January
    assert shaken["a"] == pytest.approx(usual["a"])  # 27 February


def test_half_life_table_agrees_with_the_worth_at_that_age(draws: xr.Dataset) -> None:
    half = summarise_half_life(draws, alliances=ALLIANCES).set_index("code")["half_life_days"]
    for code, age in half.items():
        rows = summarise_shelf_life(draws, ages=(age,), alliances=ALLIANCES).set_index("code")
        assert rows.loc[code, "worth_today"] == pytest.approx(500, rel=1e-2)


def test_larger_poll_has_the_shorter_half_life(draws: xr.Dataset) -> None:
    small, large = (summarise_half_life(draws, sample=n)["half_life_days"] for n in (500, 2000))
    np.testing.assert_allclose(small, 4 * large)


def test_order_of_parties_changes_nothing(draws: xr.Dataset, table: pd.DataFrame) -> None:
    turned = draws.isel(party=[3, 0, 4, 2, 1])
    other = summarise_shelf_life(turned, ages=(0, 7, 28, 56), alliances=ALLIANCES)
    keys = ["age_days", "code"]
    pd.testing.assert_frame_equal(
        table.sort_values(keys, ignore_index=True), other.sort_values(keys, ignore_index=True)
    )


def test_headline_names_the_largest_party_and_never_others(draws: xr.Dataset) -> None:
    assert headline_code(draws) == "FER"
    small = draws.copy()
    small["national_support"] = small["national_support"] * xr.where(small["party"] == "OTH", 50, 1)
    assert headline_code(small) == "FER"


def test_age_of_a_poll_counts_from_the_middle_of_its_fieldwork(draws: xr.Dataset) -> None:
    worth = polls_worth(draws, register(), code="FER").set_index("poll")
    assert worth.loc["a", "age_days"] == 7
    assert worth.loc["b", "age_days"] == 64


def test_poll_in_regional_rows_is_worth_what_it_is_worth_in_one_row(draws: xr.Dataset) -> None:
    whole = polls_worth(draws, register(), code="LAN")
    cut = pd.concat([register(respondents=[400.0, 500.0]), register(respondents=[600.0, 1000.0])])
    pd.testing.assert_frame_equal(polls_worth(draws, cut, code="LAN"), whole)


def test_stated_effective_size_takes_the_place_of_the_houses_weighting_loss(draws: xr.Dataset) -> None:
    usual = polls_worth(draws, register(), code="FER")["worth_today"]
    precise = polls_worth(draws, register(effective=[1000.0, np.nan]), code="FER")["worth_today"]
    # With no weighting loss a poll starts more precise, so the same drift costs it more respondents.
    assert precise[0] < usual[0]
    assert precise[1] == usual[1]


def test_poll_worth_may_be_stated_for_an_alliance(draws: xr.Dataset) -> None:
    worth = polls_worth(draws, register(), code="GLOW", alliances=ALLIANCES)
    assert (worth["worth_today"] < worth["respondents"]).all()
    with pytest.raises(ValueError, match="GLOW is neither a party nor an alliance"):
        polls_worth(draws, register(), code="GLOW")


def test_no_polls_give_an_empty_table_with_its_columns(draws: xr.Dataset) -> None:
    empty = polls_worth(draws, register().iloc[:0], code="FER")
    assert list(empty.columns)[:4] == ["poll", "age_days", "respondents", "worth_today"]
    assert empty.empty
