"""How far 521 seats strayed from 1987 to 1992, against the spread that the open data set itself shows.

Source: see ``uk_seats``. About a log-ratio swing that is the same everywhere the centred log-ratios spread by
.10, .15 and .20 (worked out below from the data, without any code of the project).
"""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from aggregator.inputs.contest import Contest
from aggregator.seats.baseline import build_baseline
from aggregator.seats.local_noise import LocalNoise, LocalPriors, learn_local_noise
from tests.external.uk_seats import CODES, read_uk_seats


@pytest.fixture(scope="module")
def noise() -> LocalNoise:
    before, last = read_uk_seats()
    counties, _ = read_uk_seats(by_county=True)
    contest = Contest.model_validate(
        {
            "title": "England",
            "polling_day": date(1997, 5, 1),
            "party": [{"code": c, "name": c} for c in CODES],
            "region": [{"code": "ENG", "name": "England"}],
            "others": False,
        }
    )
    baseline = build_baseline(last.assign(cluster=counties["region"], seats=1), contest=contest)
    return learn_local_noise(baseline, before_last=before, priors=LocalPriors())


def centred_spread() -> np.ndarray:
    before, last = (np.log(t[CODES].to_numpy(float)) for t in read_uk_seats())
    moved = last - before
    moved -= moved.mean(axis=1, keepdims=True)
    return moved.std(axis=0)


def test_noise_explains_the_spread_of_the_smaller_parties_and_never_less_than_the_spread_of_any(
    noise: LocalNoise,
) -> None:
    """Independent noise cannot explain all three: what the first party lost the other two did not share."""
    seen = centred_spread()
    np.testing.assert_allclose(seen, [0.10, 0.15, 0.20], atol=0.005)
    square = np.exp(2 * noise.log_sd)
    implied = np.sqrt((np.eye(3) - 1 / 3) ** 2 @ square)
    # A mean over the parties takes two thirds of a party's own noise and a third of each of the others'.
    np.testing.assert_allclose(implied[1:], seen[1:], rtol=0.15)
    assert (implied >= 0.95 * seen).all()
    assert np.array_equal(noise.seats, [521, 521, 521])


def test_seats_of_one_county_stray_together(noise: LocalNoise) -> None:
    assert 0.08 < noise.cluster_part < 0.3
