"""Two rounds by hand: outright winners, who runs again, where voters go."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from aggregator.inputs.counting_terms import CountingRule, CountingTerms
from aggregator.seats.rules import GroupTerms, GroupVotes, SeatVotes
from aggregator.seats.transfers import draw_rates, draw_transfers
from aggregator.seats.two_round import count_by_two_rounds

PARTIES = ("ASH", "BIR", "CED", "DOG")


def winner_of(
    shares: list[float],
    *,
    rates: dict[tuple[str, str], float] | None = None,
    threshold: float | None = None,
    outright: float = 50.0,
    draws: int = 1,
) -> np.ndarray:
    """Who wins one seat, by draw."""
    part = np.zeros((draws, 4, 4), dtype=np.float32)
    for (donor, heir), rate in (rates or {}).items():
        part[:, PARTIES.index(donor), PARTIES.index(heir)] = rate
    rows = SeatVotes(
        strength=np.tile(np.array(shares, dtype=np.float32)[None, :, None], (draws, 1, 1)),
        multiplier=np.ones((draws, 1, 1, 4), dtype=np.float32),
        region_start=np.array([0, 1]),
        lot=np.random.default_rng(1).random((draws, 1), dtype=np.float32),
    )
    nothing = np.zeros((draws, 1, 1, 4), dtype=np.float32)
    votes = GroupVotes(rows, nothing, np.ones((draws, 1)), np.zeros((draws, 4)))
    terms = CountingTerms(rule=CountingRule.TWO_ROUND, run_off_threshold=threshold, outright=outright)
    group = GroupTerms(terms, PARTIES, np.array([1]), np.array([], dtype=np.int64), transfers=part)
    counted = count_by_two_rounds(votes, group)
    assert (counted.seats.sum(axis=-1) == 1).all()
    np.testing.assert_array_equal(counted.won[:, 0], counted.seats[:, 0])
    return np.array(PARTIES)[counted.seats[:, 0].argmax(axis=1)]


def test_more_than_half_wins_at_once_whatever_voters_would_do_next() -> None:
    rates = {("BIR", "CED"): 1.0, ("DOG", "CED"): 1.0}
    assert winner_of([51, 9, 30, 10], rates=rates)[0] == "ASH"
    assert winner_of([49, 9, 32, 10], rates=rates)[0] == "CED"


def test_voters_of_parties_that_are_out_decide_the_run_off() -> None:
    """40 and 35 run again; of 25 others 40 % go to the first and 60 % to the second: 50 to 50, then more."""
    rates = {("CED", "ASH"): 0.3, ("CED", "BIR"): 0.6, ("DOG", "ASH"): 0.2, ("DOG", "BIR"): 0.5}
    # 40 + .3 × 15 + .2 × 10 = 46.5; 35 + .6 × 15 + .5 × 10 = 49.
    assert winner_of([40, 35, 15, 10], rates=rates)[0] == "BIR"
    # Without them the leader stays ahead.
    assert winner_of([40, 35, 15, 10])[0] == "ASH"


def test_threshold_lets_a_third_party_run_again() -> None:
    rates = {("CED", "BIR"): 1.0, ("DOG", "CED"): 1.0}
    # The first two alone: 35 + 20 = 55 for BIR. With 12.5 % three run, and BIR is given nothing.
    assert winner_of([38, 35, 20, 7], rates=rates)[0] == "BIR"
    assert winner_of([38, 35, 20, 7], rates=rates, threshold=12.5)[0] == "ASH"


def test_threshold_that_fewer_than_two_reach_leaves_the_first_two() -> None:
    rates = {("CED", "BIR"): 1.0, ("DOG", "BIR"): 1.0}
    assert winner_of([45, 25, 20, 10], rates=rates, threshold=40.0)[0] == "BIR"


def test_rates_above_one_together_are_scaled_down_to_one() -> None:
    """30 voters of the third are split 2 : 1 when the rates say 1 and ½; 37 + 20 against 33 + 10."""
    rates = {("CED", "ASH"): 1.0, ("CED", "BIR"): 0.5}
    assert winner_of([37, 33, 30, 0], rates=rates)[0] == "ASH"
    # Unscaled, 33 + 30 would beat 37 + 15.
    other = {("CED", "ASH"): 0.5, ("CED", "BIR"): 1.0}
    assert winner_of([45, 25, 30, 0], rates={("BIR", "CED"): 1.0, ("BIR", "ASH"): 1.0})[0] == "ASH"
    assert winner_of([37, 33, 30, 0], rates=other)[0] == "BIR"


def test_a_tie_in_the_run_off_is_decided_by_lot() -> None:
    won = winner_of([40, 40, 20, 0], draws=2000)
    assert set(won) == {"ASH", "BIR"}
    assert abs((won == "ASH").mean() - 0.5) < 0.045


def test_drawn_rates_have_the_mean_and_spread_that_the_desk_states() -> None:
    rates = draw_rates(0.3, sd=0.1, draws=20_000, rng=np.random.default_rng(1))
    assert rates.mean() == pytest.approx(0.3, abs=0.003)
    assert rates.std() == pytest.approx(0.1, rel=0.03)
    assert (draw_rates(1.0, sd=0.0, draws=3, rng=np.random.default_rng(1)) == 1).all()
    with pytest.raises(ValueError, match="No beta distribution"):
        draw_rates(0.01, sd=0.2, draws=3, rng=np.random.default_rng(1))


def test_a_missing_pair_is_named() -> None:
    rates = pd.DataFrame({"from": ["ASH"], "to": ["BIR"], "rate": [40.0], "sd": [5.0]})
    with pytest.raises(ValueError, match="from ASH to CED"):
        draw_transfers(rates, parties=PARTIES, draws=2, rng=np.random.default_rng(1))
