"""The simulator's own count against published examples; its run-offs and local noise against their laws."""

from fractions import Fraction

import numpy as np
import pytest

from data_demo.made_up_counting import (
    ANYONE,
    MadeUpTransfer,
    MixedCounting,
    closest_transfer,
    draw_transfers,
    transfer_table,
)
from data_demo.made_up_local_noise import CLUSTER_PART, draw_local_noise
from data_demo.made_up_seat_count import (
    count_two_rounds,
    fill_from_lists,
    most_votes,
    passing,
    share_out,
)


def votes_of(**votes: int) -> dict[str, Fraction]:
    return {code: Fraction(cast) for code, cast in votes.items()}


def test_highest_averages_give_the_seats_of_published_examples() -> None:
    """Gallagher 1991, Electoral Studies 10:33-51, table 1; Balinski and Young 1982, Fair Representation."""
    gallagher = votes_of(A=60000, B=28000, C=12000)
    assert list(share_out(gallagher, seats=5, divisors="dhondt").values()) == [4, 1, 0]
    assert list(share_out(gallagher, seats=5, divisors="sainte_lague").values()) == [3, 1, 1]
    balinski = votes_of(A=9061, B=7179, C=5259, D=3319, E=1182)
    assert list(share_out(balinski, seats=26, divisors="dhondt").values()) == [10, 7, 5, 3, 1]
    assert list(share_out(balinski, seats=26, divisors="sainte_lague").values()) == [9, 8, 5, 3, 1]


def test_a_tie_stops_the_count() -> None:
    with pytest.raises(ValueError, match="Tied: A, B"):
        most_votes(votes_of(A=5, B=5, C=4))
    with pytest.raises(ValueError, match="Tied: A, B"):
        share_out(votes_of(A=5, B=5, C=4), seats=4, divisors="dhondt")
    assert share_out(votes_of(A=5, B=5, C=4), seats=2, divisors="dhondt") == {"A": 1, "B": 1, "C": 0}


def test_a_threshold_counts_all_votes_and_spares_who_is_exempt() -> None:
    cast = votes_of(A=900, B=40, C=9, OTH=51)
    assert set(passing(cast, threshold=4.0, exempt=("C",))) == {"A", "B", "C"}
    one_more = cast | {"OTH": Fraction(52)}
    assert set(passing(one_more, threshold=4.0, exempt=("C",))) == {"A", "C"}


def test_lists_make_up_the_proportion_and_the_chamber_grows_by_the_fewest_seats_it_takes() -> None:
    cast = votes_of(A=503, B=304, C=193)
    assert fill_from_lists(cast, local={"A": 4, "B": 1, "C": 0}, seats=5) == {"A": 1, "B": 2, "C": 2}
    # A holds 7 of 10 and is due about half of all.
    grown = fill_from_lists(cast, local={"A": 7, "B": 0, "C": 0}, seats=3)
    assert grown["A"] == 0
    size = 7 + sum(grown.values())
    fewer = share_out(cast, seats=size - 1, divisors="sainte_lague")
    assert fewer["A"] < 7 <= share_out(cast, seats=size, divisors="sainte_lague")["A"]


def test_seats_won_by_a_party_without_a_list_stand_outside_the_proportion() -> None:
    cast = votes_of(A=51, B=49)
    filled = fill_from_lists(cast, local={"A": 2, "B": 1, "OTH": 3}, seats=2)
    assert filled == {"A": 1, "B": 1}


def test_more_than_half_the_votes_need_no_second_round_and_exactly_half_do() -> None:
    rates = {("C", "A"): Fraction(1, 4), ("C", "B"): Fraction(1, 2)}
    assert count_two_rounds(votes_of(A=51, B=30, C=19), rates=rates) == ("A", {})
    winner, second = count_two_rounds(votes_of(A=50, B=30, C=20), rates=rates)
    assert winner == "A"
    assert second == {"A": Fraction(55), "B": Fraction(40)}


def test_the_second_wins_a_run_off_on_the_votes_of_who_is_out_and_no_voter_counts_twice() -> None:
    rates = {("C", "A"): Fraction(1, 2), ("C", "B"): Fraction(1)}
    winner, second = count_two_rounds(votes_of(A=40, B=35, C=25), rates=rates)
    assert winner == "B"
    assert second == {"A": 40 + Fraction(25, 3), "B": 35 + Fraction(50, 3)}
    assert sum(second.values()) == 100


COUNTING = MixedCounting(
    list_seats=1,
    threshold=4.0,
    exempt=(),
    by_district=("D",),
    by_two_rounds=("R",),
    transfers=(
        MadeUpTransfer(ANYONE, ANYONE, 30.0, 10.0),
        MadeUpTransfer("A", ANYONE, 20.0, 10.0),
        MadeUpTransfer(ANYONE, "B", 50.0, 10.0),
        MadeUpTransfer("C", "B", 70.0, 10.0),
    ),
)


def test_the_closest_row_of_transfers_holds() -> None:
    pairs = {("C", "B"): 70.0, ("A", "B"): 20.0, ("D", "B"): 50.0, ("D", "A"): 30.0}
    for (donor, heir), rate in pairs.items():
        assert closest_transfer(COUNTING, donor=donor, heir=heir).rate == rate
    assert list(transfer_table(COUNTING)) == ["from", "to", "rate", "sd"]


def test_drawn_transfers_have_the_mean_and_spread_of_their_row() -> None:
    drawn = np.array(
        [
            draw_transfers(COUNTING, codes=("C", "B"), rng=np.random.default_rng(seed))["rate"]
            for seed in range(400)
        ]
    )
    np.testing.assert_allclose(drawn.mean(axis=0), [70, 30], atol=2)
    np.testing.assert_allclose(drawn.std(axis=0), [10, 10], rtol=0.15)
    assert draw_transfers(None, codes=("C", "B"), rng=np.random.default_rng(0)).empty


def test_neighbours_share_their_part_of_the_noise_and_others_none() -> None:
    rng = np.random.default_rng(3)
    local_sd = np.array([0.1, 0.2])
    clusters = ["east", "east", "west", ""]
    noise = np.array([draw_local_noise(local_sd, seats=4, clusters=clusters, rng=rng) for _ in range(20_000)])
    np.testing.assert_allclose(noise.std(axis=0), np.tile(local_sd, (4, 1)), rtol=0.06)
    alike = np.corrcoef(noise[:, :, 0], rowvar=False)
    assert alike[0, 1] == pytest.approx(CLUSTER_PART, abs=0.05)
    np.testing.assert_allclose(alike[[0, 0, 2], [2, 3, 3]], 0, atol=0.05)
