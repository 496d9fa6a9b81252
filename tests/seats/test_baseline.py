"""Where seats start when a party had no candidate, no votes, or no right to stand."""

from __future__ import annotations

import numpy as np
import pytest

from aggregator.seats.baseline import BaselinePriors, build_baseline
from tests.made_up_draws import made_up_contest, made_up_last_result


def test_party_without_candidate_last_time_starts_at_its_share_elsewhere_in_the_region() -> None:
    result = made_up_last_result()
    baseline = build_baseline(result, contest=made_up_contest())
    elsewhere = result[(result["region"] == "PORT") & (result["HED"] > 0)]
    codes = list(made_up_contest().party_codes)
    expected = elsewhere["HED"].sum() / elsewhere[codes].to_numpy().sum()
    cell = {"seat": "PO01", "party": "HED"}
    assert np.exp(baseline["log_share"].sel(cell).item()) == pytest.approx(expected)
    assert baseline["unseen_sd"].sel(cell).item() == BaselinePriors().unseen_sd
    assert baseline["last_share"].sel(cell).item() == 0


def test_party_without_last_votes_starts_equal_everywhere_and_with_more_spread() -> None:
    baseline = build_baseline(made_up_last_result(), contest=made_up_contest())
    newcomer = baseline.sel(party="TID")
    assert np.unique(newcomer["log_share"]).size == 1
    assert (newcomer["unseen_sd"] > 0).all()


def test_party_with_last_votes_has_no_extra_spread_and_starts_where_it_was() -> None:
    result = made_up_last_result().set_index("seat")
    baseline = build_baseline(result.reset_index(), contest=made_up_contest()).sel(party="FER")
    share = result["FER"] / result[list(made_up_contest().party_codes)].sum(axis=1)
    np.testing.assert_allclose(
        np.exp(baseline["log_share"]), share.loc[baseline["seat"].to_numpy()].to_numpy(), rtol=1e-12
    )
    assert (baseline["unseen_sd"] == 0).all()


def test_party_that_does_not_stand_in_a_region_is_absent_from_its_seats() -> None:
    result = made_up_last_result()
    result.loc[result["region"] == "SKERRY", "HED"] = 50.0
    baseline = build_baseline(result, contest=made_up_contest()).sel(party="HED")
    np.testing.assert_array_equal(
        np.isneginf(baseline["log_share"]), baseline["seat_region"].to_numpy() == "SKERRY"
    )


def test_seat_weights_sum_to_one_in_each_region_and_follow_votes_cast() -> None:
    result = made_up_last_result()
    baseline = build_baseline(result, contest=made_up_contest())
    np.testing.assert_allclose(baseline["weight"].groupby("seat_region").sum(), 1)
    votes = result.set_index("seat")[list(made_up_contest().party_codes)].sum(axis=1)
    ratio = baseline["weight"].sel(seat="PO02") / baseline["weight"].sel(seat="PO03")
    assert ratio.item() == pytest.approx(votes["PO02"] / votes["PO03"])


def test_seat_won_unopposed_without_votes_weighs_as_the_mean_seat() -> None:
    result = made_up_last_result()
    codes = list(made_up_contest().party_codes)
    result.loc[result["seat"] == "DO01", codes] = 0.0
    baseline = build_baseline(result, contest=made_up_contest())
    assert baseline["weight"].sel(seat="DO01").item() == pytest.approx(1 / 8)
    assert np.isfinite(baseline["log_share"].sel(seat="DO01")).all()


def test_a_result_by_region_only_is_refused() -> None:
    result = made_up_last_result().assign(seat="")
    with pytest.raises(ValueError, match="nothing can be counted in seats"):
        build_baseline(result, contest=made_up_contest())
