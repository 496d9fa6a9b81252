"""Simultaneous bands against simulation, and which places of a study enter them."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from scipy.stats import beta, norm

from aggregator.studies.invented_elections import Quantity
from aggregator.studies.places import ANY_REGION, gather_places, judge_all_places
from aggregator.studies.uniformity import curves_of_places, judge_places, simultaneous_band


def test_uniform_places_leave_the_band_as_rarely_as_stated() -> None:
    """The band for one curve of 100 places and a false alarm of one in ten, by simulation."""
    rng = np.random.default_rng(1)
    outside = [
        not judge_places(pd.DataFrame({"x": rng.random(100)}), false_alarm=0.1)["inside"].item()
        for _ in range(400)
    ]
    assert np.mean(outside) == pytest.approx(0.1, abs=3.5 * np.sqrt(0.09 / 400))


def test_the_band_is_wider_than_one_that_holds_each_place_alone() -> None:
    """Pointwise, the curve at z is binomial: its band there is narrower than the simultaneous one."""
    band = simultaneous_band(200, false_alarm=0.05)
    middle = band.iloc[(band["place"] - 0.5).abs().argmin()]
    pointwise = 1.96 * np.sqrt(0.25 / 200)
    assert middle["low"] < 0.5 - pointwise and middle["high"] > 0.5 + pointwise


def test_narrow_wide_and_shifted_posteriors_leave_the_band() -> None:
    rng = np.random.default_rng(2)
    z = rng.normal(size=200)
    places = pd.DataFrame(
        {
            "right": norm.cdf(z),
            "narrow": norm.cdf(1.6 * z),
            "wide": norm.cdf(0.6 * z),
            "shifted": norm.cdf(z + 0.5),
        }
    )
    judged = judge_places(places, false_alarm=0.05)
    assert judged["inside"].to_dict() == {"right": True, "narrow": False, "wide": False, "shifted": False}
    assert judged.loc["narrow", "spread"] > 1.2 > 0.8 > judged.loc["wide", "spread"]
    assert judged.loc["shifted", "bias"] > 4
    curves = curves_of_places(places, false_alarm=0.05)
    left = curves[(curves["away"] < curves["low"] - 1e-12) | (curves["away"] > curves["high"] + 1e-12)]
    assert set(left["quantity"]) == {"narrow", "wide", "shifted"}


def test_places_of_a_study_have_one_row_per_election_and_one_region_by_lot() -> None:
    rows = [
        (election, quantity, region, code)
        for election in range(30)
        for quantity, regions in (
            (Quantity.SUPPORT_POLLING_DAY, ("", "R1", "R2")),
            (Quantity.SUPPORT_TODAY, ("",)),
            (Quantity.SEATS, ("",)),
        )
        for region in regions
        for code in ("P1", "P2", "OTH")
    ]
    judged = pd.DataFrame(rows, columns=["election", "quantity", "region", "code"])
    judged["place"] = np.random.default_rng(0).random(len(judged))
    kinds = gather_places(judged, rng=np.random.default_rng(1))
    assert list(kinds) == ["support on polling day", "support today", "seats", ANY_REGION]
    assert all(len(places) == 30 for places in kinds.values())
    assert list(kinds["seats"].columns) == ["P1", "P2", "OTH"]
    assert kinds[ANY_REGION].shape == (30, 1)
    together = judge_all_places(kinds)
    assert len(together) == 10 and together["inside"].all()


def test_ranks_of_beta_posteriors_of_binomial_data_are_uniform() -> None:
    """An exact case: truth from a uniform prior, a binomial count, and the beta posterior of the textbook."""
    rng = np.random.default_rng(7)
    truth = rng.random(300)
    found = rng.binomial(40, truth)
    places = pd.DataFrame({"share": beta.cdf(truth, found + 1, 40 - found + 1)})
    assert judge_places(places, false_alarm=0.01)["inside"].all()
