"""Who passes a threshold: alone, on a joint list, or free of it."""

from __future__ import annotations

import numpy as np
import pytest

from aggregator.seats.apportion.thresholds import passes_threshold


def test_a_party_at_the_threshold_passes() -> None:
    votes = np.array([[500, 60, 50, 49, 341]])
    passes = passes_threshold(votes / 1000, threshold=0.05)
    assert passes.tolist() == [[True, True, True, False, True]]


@pytest.mark.parametrize("total", [1000, 999_999, 33_333_333])
def test_shares_of_whole_votes_are_judged_as_the_votes_would_be(total: int) -> None:
    needed = -(-total * 5 // 100)
    votes = np.array([[needed, total - needed], [needed - 1, total - needed + 1]])
    assert passes_threshold(votes / total, threshold=0.05)[:, 0].tolist() == [True, False]


def test_a_joint_list_passes_or_fails_as_one() -> None:
    shares = np.array([[0.04, 0.03, 0.93], [0.01, 0.03, 0.96]])
    passes = passes_threshold(shares, threshold=0.05, lists=[[0, 1]])
    assert passes.tolist() == [[True, True, True], [False, False, True]]


def test_a_joint_list_can_need_more_than_a_party() -> None:
    shares = np.array([[0.06, 0.01, 0.93], [0.06, 0.02, 0.92]])
    passes = passes_threshold(shares, threshold=0.05, lists=[[0, 1]], alliance_threshold=0.08)
    assert passes.tolist() == [[False, False, True], [True, True, True]]


def test_rounding_of_a_sum_keeps_no_joint_list_out() -> None:
    assert 0.7 + 0.1 < 0.8
    passes = passes_threshold(np.array([[0.7, 0.1, 0.2]]), threshold=0.8, lists=[[0, 1]])
    assert passes.tolist() == [[True, True, False]]


def test_exempt_parties_need_no_threshold() -> None:
    exempt = np.array([False, True, False])
    passes = passes_threshold(np.array([[0.98, 0.01, 0.01]]), threshold=0.05, exempt=exempt)
    assert passes.tolist() == [[True, True, False]]


def test_a_joint_list_is_exempt_only_if_all_its_members_are() -> None:
    exempt = np.array([False, True, True, True])
    passes = passes_threshold(
        np.array([[0.01, 0.01, 0.01, 0.01, 0.96]]),
        threshold=0.05,
        exempt=np.append(exempt, False),
        lists=[[0, 1], [2, 3]],
    )
    assert passes.tolist() == [[False, False, True, True, True]]


def test_where_nobody_passes_the_row_has_no_threshold() -> None:
    shares = np.array([[0.25, 0.25, 0.25, 0.25], [0.4, 0.2, 0.2, 0.2]])
    passes = passes_threshold(shares, threshold=0.3)
    assert passes.tolist() == [[True] * 4, [True, False, False, False]]


def test_no_threshold_lets_all_pass() -> None:
    assert passes_threshold(np.array([[0.999, 0.001]]), threshold=0.0).all()


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"threshold": 5.0}, "threshold: got 5.0; expected a share, 0 or more and below 1"),
        ({"alliance_threshold": -0.1}, "alliance_threshold: got -0.1; expected a share"),
        ({"exempt": np.zeros(3, dtype=bool)}, r"exempt: got shape \(3,\); expected \(2,\), one per party"),
        ({"lists": [[0, 2]]}, r"lists: got \[\[0, 2\]\]; expected positions from 0 to 1 in each"),
        ({"lists": [[]]}, r"lists: got \[\[\]\]; expected positions from 0 to 1 in each"),
        ({"lists": [[0], [1, 0]]}, "a party can be on one list only"),
    ],
)
def test_questions_without_an_answer_are_refused(change: dict[str, object], message: str) -> None:
    question = {"threshold": 0.05, **change}
    with pytest.raises(ValueError, match=message):
        passes_threshold(np.ones((1, 2)) / 2, **question)  # type: ignore[arg-type]
