"""No stronger verb than the number allows, bands that hold, and errors by age."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from aggregator.replays.calibration import summarise_places, summarise_reliability
from aggregator.replays.compare_methods import compare_methods, effective_number, standard_error
from aggregator.replays.staleness import measure_staleness

DAYS = pd.date_range("2033-01-02", periods=20, freq="7D")


def scores(errors: dict[str, dict[str, np.ndarray]]) -> pd.DataFrame:
    """Scores of one party by contest and method, one error per date."""
    tables = []
    for contest, by_method in errors.items():
        for method, values in by_method.items():
            tables.append(
                pd.DataFrame(
                    {
                        "contest": contest,
                        "as_of": DAYS[: len(values)],
                        "days_before": [140 - 7 * place for place in range(len(values))],
                        "method": method,
                        "quantity": "support",
                        "region": "",
                        "code": "FER",
                        "level": "party",
                        "error": values,
                        "crps": np.abs(values),
                        "width_90": 5.0,
                        "pit": 0.5,
                    }
                )
            )
    return pd.concat(tables, ignore_index=True)


def over_all(table: pd.DataFrame) -> pd.Series:
    return table[(table["lead"] == "all") & (table["rival"] == "latest_poll")].iloc[0]


def test_a_series_that_hardly_changes_counts_as_about_one_date_and_noise_as_nearly_all():
    rng = np.random.default_rng(1)
    walk = np.cumsum(rng.normal(size=60))
    assert effective_number(walk) < 6
    noise = np.mean([effective_number(rng.normal(size=60)) for _ in range(50)])
    assert 35 < noise <= 60


def test_the_standard_error_of_an_autocorrelated_mean_is_about_right():
    """Simulated: first-order autoregression with r = .6, whose mean of 200 values has a known variance."""
    rng = np.random.default_rng(2)
    stated, means = [], []
    for _ in range(200):
        steps = rng.normal(size=300)
        series = np.zeros(300)
        for place in range(1, 300):
            series[place] = 0.6 * series[place - 1] + steps[place]
        kept = series[100:]
        means.append(kept.mean())
        stated.append(standard_error(kept, units=effective_number(kept)))
    assert np.mean(stated) == pytest.approx(np.std(means), rel=0.25)


def test_two_methods_that_differ_by_noise_have_no_clear_difference():
    rng = np.random.default_rng(3)
    clear = []
    for _ in range(20):
        drift = np.cumsum(rng.normal(size=20))
        rows = scores(
            {"A": {"fieldfold": drift, "latest_poll": drift + np.cumsum(rng.normal(0, 1, 20)) * 0.5}}
        )
        clear.append(over_all(compare_methods(rows))["nearer"] != "no clear difference")
    # Two such walks do differ on the dates at hand, now and then; not half the time.
    assert np.mean(clear) < 0.5


def test_a_rival_that_is_always_nearer_is_said_to_be():
    rng = np.random.default_rng(4)
    rows = scores({"A": {"fieldfold": 3 + rng.normal(0, 0.2, 20), "latest_poll": 1 + rng.normal(0, 0.2, 20)}})
    found = over_all(compare_methods(rows))
    assert (found["nearer"], found["unit"]) == ("rival", "date")
    assert found["difference"] == pytest.approx(-2, abs=0.2)


def test_a_few_dates_are_no_evidence():
    rows = scores({"A": {"fieldfold": np.full(4, 3.0), "latest_poll": np.array([1.0, 1.1, 0.9, 1.0])}})
    found = over_all(compare_methods(rows))
    assert found["nearer"] == "no clear difference" and np.isnan(found["standard_error"])


def test_over_several_contests_the_contest_is_the_unit_however_many_dates_it_has():
    errors = {
        name: {"fieldfold": np.full(dates, 1.0), "latest_poll": np.full(dates, 1.0 + gap)}
        for name, dates, gap in (("A", 20, 1.0), ("B", 2, 2.0), ("C", 2, 3.0))
    }
    found = over_all(compare_methods(scores(errors)))
    assert (found["unit"], found["units"], found["contests"]) == ("contest", 3, 3)
    assert found["difference"] == pytest.approx(2.0)
    # sd 1 over root 3, times Student's t at one standard deviation with two degrees of freedom (1.321).
    assert found["standard_error"] == pytest.approx(1.321 / np.sqrt(3), rel=1e-3)


def test_alliances_do_not_count_their_members_again():
    rows = scores({"A": {"fieldfold": np.full(8, 1.0), "latest_poll": np.full(8, 2.0)}})
    doubled = pd.concat([rows, rows.assign(code="GLOW", level="alliance", error=9.0)])
    assert over_all(compare_methods(doubled))["own_error"] == 1.0


def test_the_band_of_reliability_counts_a_seat_once_however_often_it_was_replayed():
    rng = np.random.default_rng(5)
    rows = pd.DataFrame(
        {
            "contest": "A",
            "as_of": np.tile(DAYS, 30),
            "seat": np.repeat([f"S{n}" for n in range(30)], 20),
            "code": "FER",
            "chance": rng.uniform(0.61, 0.69, 600),
            "won": np.repeat(rng.integers(0, 2, 30), 20),
        }
    )
    table = summarise_reliability(rows)
    assert table[["forecasts", "once"]].iloc[0].tolist() == [600, 30]
    assert table["high"].iloc[0] - table["low"].iloc[0] > 0.25


def test_the_band_of_reliability_holds_right_chances_of_independent_seats():
    rng = np.random.default_rng(6)
    inside = []
    for _ in range(60):
        chance = rng.uniform(size=400)
        rows = pd.DataFrame(
            {
                "contest": "A", "as_of": DAYS[0], "seat": np.arange(400), "code": "FER", "chance": chance,
                "won": (rng.uniform(size=400) < chance).astype(float),
            }
        )  # fmt: skip
        table = summarise_reliability(rows)
        inside += ((table["low"] <= table["share_won"]) & (table["share_won"] <= table["high"])).tolist()
    assert 0.88 < np.mean(inside) < 0.98


def test_places_fill_ten_bins_whose_shares_sum_to_one():
    rows = scores({"A": {"fieldfold": np.ones(20)}}).assign(pit=np.linspace(0.0, 1.0, 20))
    table = summarise_places(rows)
    assert len(table) == 10
    assert table["share"].sum() == pytest.approx(1.0)
    assert table["forecasts"].sum() == 20


def test_staleness_sets_polls_formula_and_estimate_of_one_distance_side_by_side():
    rows = scores({"A": {"fieldfold": np.array([3.0, -3.0])}}).assign(days_before=[30, 35])
    polls = pd.DataFrame(
        {
            "contest": "A", "poll": ["P1", "P2", "P3"], "code": "FER", "level": "party",
            "days_before": [28.0, 41.5, 60.0], "sample": [800.0, 1200.0, 500.0], "error": [4.0, -2.0, 9.0],
        }
    )  # fmt: skip
    formula = pd.DataFrame({"contest": "A", "days_before": [33.0], "code": "FER", "expected_error": [3.7]})
    table = measure_staleness(rows, poll_errors=polls, expected_errors=formula)
    row = table[(table["days_from"] == 28) & (table["code"] == "FER")].iloc[0]
    assert (row["polls"], row["sample"], row["estimates"]) == (2, 1000, 2)
    assert row["poll_error"] == pytest.approx(np.sqrt(10))
    assert (row["expected_error"], row["estimate_error"]) == (3.7, 3.0)
    assert row["estimate_expected"] == pytest.approx(5.0 / 3.2897, rel=1e-3)


def test_in_staleness_each_contest_counts_once_whatever_its_number_of_polls():
    rows = scores({"A": {"fieldfold": np.array([1.0])}, "B": {"fieldfold": np.array([1.0])}}).assign(
        days_before=10
    )
    polls = pd.DataFrame(
        {
            "contest": ["A"] * 9 + ["B"], "poll": [f"P{n}" for n in range(10)], "code": "FER",
            "level": "party", "days_before": 10.0, "sample": 1000.0, "error": [1.0] * 9 + [7.0],
        }
    )  # fmt: skip
    formula = pd.DataFrame({"contest": "A", "days_before": [9.0], "code": "FER", "expected_error": [2.0]})
    table = measure_staleness(rows, poll_errors=polls, expected_errors=formula)
    assert table.loc[table["code"] == "FER", "poll_error"].tolist() == pytest.approx([5.0])
