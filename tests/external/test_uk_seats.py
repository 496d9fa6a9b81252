"""Known numbers of the 521 seats, so that a change in the data or its reading is seen first here.

Won seats, means and swings are sums over the open data set named in ``uk_seats``.
"""

import numpy as np
import pandas as pd
import pytest

from tests.external.uk_seats import CODES, read_uk_seats


def _shares(table: pd.DataFrame) -> np.ndarray:
    votes = table[CODES].to_numpy(float)
    return votes / votes.sum(axis=1, keepdims=True)


@pytest.fixture(scope="module")
def shares() -> tuple[np.ndarray, np.ndarray]:
    last, outcome = read_uk_seats()
    return _shares(last), _shares(outcome)


def _won(values: np.ndarray) -> list[int]:
    return np.bincount(values.argmax(axis=1), minlength=3).tolist()


def _wrong(values: np.ndarray, truth: np.ndarray) -> int:
    return int((values.argmax(axis=1) != truth.argmax(axis=1)).sum())


def _log_ratio_swing(last: np.ndarray, target: np.ndarray) -> np.ndarray:
    shift = np.zeros(3)
    for _ in range(200):
        moved = last * np.exp(shift)
        moved /= moved.sum(axis=1, keepdims=True)
        shift += np.log(target / moved.mean(axis=0))
    return moved


def test_seats_won_and_mean_shares_of_both_elections(shares: tuple[np.ndarray, np.ndarray]) -> None:
    last, now = shares
    assert _won(last) == [357, 154, 10]
    assert _won(now) == [317, 194, 10]
    np.testing.assert_allclose(last.mean(axis=0), [0.4566, 0.3082, 0.2353], atol=5e-5)
    np.testing.assert_allclose(now.mean(axis=0), [0.4492, 0.3612, 0.1896], atol=5e-5)


def test_uniform_swing_counts_327_190_4_with_32_seats_wrong(shares: tuple[np.ndarray, np.ndarray]) -> None:
    last, now = shares
    moved = last + (now.mean(axis=0) - last.mean(axis=0))
    assert _won(moved) == [327, 190, 4]
    assert _wrong(moved, now) == 32
    np.testing.assert_allclose((now - moved).std(axis=0), [0.026, 0.037, 0.045], atol=0.0006)


def test_proportional_swing_counts_323_195_3_with_32_seats_wrong(
    shares: tuple[np.ndarray, np.ndarray],
) -> None:
    last, now = shares
    moved = last * now.mean(axis=0) / last.mean(axis=0)
    assert _won(moved) == [323, 195, 3]
    assert _wrong(moved, now) == 32


def test_mean_matched_log_ratio_swing_counts_315_204_2_with_29_seats_wrong(
    shares: tuple[np.ndarray, np.ndarray],
) -> None:
    last, now = shares
    moved = _log_ratio_swing(last, now.mean(axis=0))
    assert _won(moved) == [315, 204, 2]
    assert _wrong(moved, now) == 29


def test_residuals_have_heavy_tails_and_slope_on_the_last_centred_log_share(
    shares: tuple[np.ndarray, np.ndarray],
) -> None:
    last, now = shares
    residual = np.log(now / _log_ratio_swing(last, now.mean(axis=0)))
    centred = residual - residual.mean(axis=1, keepdims=True)
    np.testing.assert_allclose(centred.std(axis=0), [0.10, 0.15, 0.20], atol=0.006)
    standard = (centred - centred.mean(axis=0)) / centred.std(axis=0)
    excess = (standard**4).mean(axis=0) - 3
    assert (excess > 1).all()
    strength = np.log(last) - np.log(last).mean(axis=1, keepdims=True)
    slopes = [np.polyfit(strength[:, k], centred[:, k], 1)[0] for k in (0, 2)]
    np.testing.assert_allclose(slopes, [-0.11, 0.14], atol=0.005)


def test_no_seat_goes_by_a_missing_or_wrong_label() -> None:
    last, outcome = read_uk_seats(by_county=True)
    assert len(last) == 521
    assert (last[["seat", "name", "region"]] == outcome[["seat", "name", "region"]]).all(axis=None)
    assert last["seat"].is_unique and last["name"].is_unique
    assert last["name"].str.startswith("Unlabelled").sum() == 3
    assert not last["region"].str.contains("Glasgow").any()
    assert (last["region"] == "Unlabelled").sum() == 2
    assert last[CODES].sum(axis=1).between(49_998, 50_002).all()
