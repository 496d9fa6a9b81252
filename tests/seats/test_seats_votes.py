r"""How seats follow votes, against the law of the cubic proportion and the normal model behind it.

Kendall & Stuart (1950) show that the law, :math:`S_A / S_B = (V_A / V_B)^3`, follows where the shares of a
party over the constituencies are about normal with a standard deviation of .137 and all move by the same
points: then :math:`S(V) = \Phi((V - 1/2) / \sigma)`, of slope :math:`\phi(0) / \sigma = 2.91` at equal votes,
where the law has 3. Where log-ratios move instead, a seat at share v moves by v (1 - v) and the country by
the mean of that, 1/4 - σ²: the slope is larger by 1 / (1 - 4σ²).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr
from scipy.stats import norm

from aggregator.seats.seats_votes import lead_at_equal_votes, plan_shifts, responsiveness, seats_at_votes

SD = 0.137
SEATS = 4_000
FloatArray = np.ndarray


def normal_chamber(centre: float = 0.5) -> FloatArray:
    """Shares of FER over the seats, spread as the normal distribution has it."""
    return norm.ppf((np.arange(SEATS) + 0.5) / SEATS, centre, SD).clip(0.001, 0.999)


def log_ratio(shares: FloatArray, factor: float) -> FloatArray:
    odds = shares / (1 - shares) * np.exp(factor)
    return odds / (1 + odds)


def in_points(shares: FloatArray, factor: float) -> FloatArray:
    return shares + factor / 4  # near one half a log-ratio moves a share by a quarter of itself


def shifted_chamber(
    shares: FloatArray, *, move: Callable[[FloatArray, float], FloatArray] = log_ratio, pairs=()
) -> xr.Dataset:
    """Two parties, one draw: the seats of FER and LAN, and their votes, under the planned shifts."""
    votes = np.array([shares.mean(), 1 - shares.mean()])
    plan = plan_shifts(
        xr.DataArray(votes[None, None], dims=("chain", "draw", "party"), coords={"party": ["FER", "LAN"]}),
        codes={"FER": ["FER"], "LAN": ["LAN"]},
        pairs=pairs,
    )
    factor = (plan.sel(party="FER") - plan.sel(party="LAN")).values
    moved = np.stack([move(shares, f) for f in factor])
    first = np.stack([(moved > 0.5).sum(axis=1), moved.mean(axis=1)])
    dims = ("draw", "shift", "party")
    return xr.Dataset(
        {
            "seats": (dims, np.stack([first[0], SEATS - first[0]], axis=-1)[None]),
            "votes": (dims, np.stack([first[1], 1 - first[1]], axis=-1)[None]),
        },
        coords={"party": ["FER", "LAN"]} | {name: plan[name] for name in ("code", "against", "log_factor")},
    )


def part(shifted: xr.Dataset, code: str, against: str = "") -> xr.Dataset:
    chosen = (shifted["code"] == code) & (shifted["against"] == against)
    return shifted.isel(shift=np.flatnonzero(chosen.values))


def slope_at_equal_votes(shifted: xr.Dataset) -> float:
    """Percent of the seats per percent of the vote."""
    return float(responsiveness(part(shifted, "FER"), members=["FER"])[0]) / SEATS * 100


def test_the_slope_of_evenly_moved_normal_seats_is_that_of_kendall_and_stuart():
    slope = slope_at_equal_votes(shifted_chamber(normal_chamber(), move=in_points))
    # Over two points to either side: (Phi(.02 / sd) - Phi(-.02 / sd)) / .04, a little below phi(0) / sd.
    assert slope == pytest.approx((2 * norm.cdf(0.02 / SD) - 1) / 0.04, rel=0.005)
    assert slope == pytest.approx(norm.pdf(0) / SD, rel=0.01)
    assert slope == pytest.approx(3, rel=0.05)


def test_the_slope_of_seats_moved_in_log_ratios_is_larger_by_what_the_theory_says():
    slope = slope_at_equal_votes(shifted_chamber(normal_chamber()))
    assert slope == pytest.approx(norm.pdf(0) / SD / (1 - 4 * SD**2), rel=0.01)


def test_the_curve_follows_the_cubic_proportion():
    curve = seats_at_votes(part(shifted_chamber(normal_chamber(), move=in_points), "FER"), members=["FER"])
    votes = curve["votes"].values
    assert votes == pytest.approx(np.arange(0.40, 0.601, 0.01))
    law = votes**3 / (votes**3 + (1 - votes) ** 3)
    # The normal law and the cube law part by about a seat in a hundred at ten points from equality.
    assert curve.values[:, 0] / SEATS == pytest.approx(law, abs=0.012)
    assert curve.values[:, 0] / SEATS == pytest.approx(norm.cdf((votes - 0.5) / SD), abs=0.002)


@pytest.mark.parametrize("centre", [0.42, 0.5, 0.57])
def test_a_chamber_that_favours_nobody_has_no_lead_at_equal_votes(centre):
    shifted = shifted_chamber(normal_chamber(centre), move=in_points, pairs=[("FER", "LAN")])
    lead, vote = lead_at_equal_votes(part(shifted, "FER", "LAN"), members=["FER"], rivals=["LAN"])
    assert vote == pytest.approx([0.5], abs=1e-9)
    assert abs(lead[0]) / SEATS < 0.003


def test_a_chamber_that_wastes_the_votes_of_one_party_shows_the_lead_of_the_other():
    # FER wins 40 % of the seats with 80 % and loses 60 % with 30 %: equal votes, a fifth fewer seats.
    shares = np.where(np.arange(SEATS) < 0.4 * SEATS, 0.8, 0.3)
    shifted = shifted_chamber(shares, pairs=[("FER", "LAN")])
    lead, _ = lead_at_equal_votes(part(shifted, "FER", "LAN"), members=["FER"], rivals=["LAN"])
    assert lead == pytest.approx([-0.2 * SEATS])


def test_each_curve_is_that_of_its_own_code():
    shifted = shifted_chamber(normal_chamber(0.45))
    ours = seats_at_votes(part(shifted, "FER"), members=["FER"])
    theirs = seats_at_votes(part(shifted, "LAN"), members=["LAN"])
    assert (np.diff(ours.values[:, 0]) > 0).all()
    assert (np.diff(theirs.values[:, 0]) > 0).all()
    # Two parties: what one has at v the other leaves at 1 - v.
    there = {round(float(v), 2): s for v, s in zip(theirs["votes"], theirs.values[:, 0], strict=True)}
    for vote, seats in zip(ours["votes"].values, ours.values[:, 0], strict=True):
        if round(1 - vote, 2) in there:
            assert seats + there[round(1 - vote, 2)] == pytest.approx(SEATS, abs=3)


def test_every_draw_gets_to_both_ends_of_every_curve():
    rng = np.random.default_rng(5)
    votes = rng.dirichlet([60, 50, 16, 6], size=(2, 100))
    plan = plan_shifts(
        xr.DataArray(votes, dims=("chain", "draw", "party"), coords={"party": ["FER", "LAN", "HED", "TID"]}),
        codes={"FER": ["FER"], "TID": ["TID"], "GLOW": ["LAN", "HED"]},
        pairs=[("FER", "GLOW")],
    )
    share = votes.reshape(-1, 4)[:, None, :] * np.exp(plan.values)
    share /= share.sum(axis=-1, keepdims=True)
    shifted = xr.Dataset(
        {"seats": (("draw", "shift", "party"), share), "votes": (("draw", "shift", "party"), share)},
        coords={"party": ["FER", "LAN", "HED", "TID"]}
        | {name: plan[name] for name in ("code", "against", "log_factor")},
    )
    for code, members in {"FER": ["FER"], "TID": ["TID"], "GLOW": ["LAN", "HED"]}.items():
        curve = seats_at_votes(part(shifted, code), members=members)
        assert curve.sizes["votes"] >= (12 if code == "TID" else 20)
        # Seats are the votes here, so the curve is the diagonal and one point of vote one of seats.
        off = np.abs(curve.values - curve["votes"].values[:, None]).max(axis=0) > 1e-9
        assert off.mean() <= 0.02  # the few draws far from the rest
        assert responsiveness(part(shifted, code), members=members) == pytest.approx(0.01)
    lead, vote = lead_at_equal_votes(part(shifted, "FER", "GLOW"), members=["FER"], rivals=["LAN", "HED"])
    assert lead == pytest.approx(0, abs=1e-9)
    assert ((vote > 0.3) & (vote < 0.55)).all()
