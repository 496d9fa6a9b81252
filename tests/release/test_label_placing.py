"""Direct labels at the right end of a chart never overlap, and move as little as possible."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from aggregator.release.label_placing import spread_labels

wanted_places = st.lists(st.floats(0, 100, allow_nan=False), min_size=1, max_size=12)


@given(wanted_places)
def test_labels_keep_their_distance_and_stay_in_the_room(wanted):
    placed = spread_labels(wanted, gap=5, low=0, high=100)
    assert np.diff(np.sort(placed)).min(initial=5) >= 5 - 1e-9
    assert placed.min() >= -1e-9
    assert placed.max() <= 100 + 1e-9


@given(wanted_places)
def test_labels_keep_the_order_of_their_marks(wanted):
    placed = spread_labels(wanted, gap=5, low=0, high=100)
    values = np.asarray(wanted)
    for one in range(len(wanted)):
        assert (placed[values > values[one]] > placed[one]).all()


def test_labels_that_have_room_stay_where_they_are():
    assert spread_labels([10, 50, 30], gap=5, low=0, high=100).tolist() == [10, 50, 30]


def test_two_labels_at_one_place_part_evenly_with_the_first_on_top():
    assert spread_labels([50, 50], gap=4, low=0, high=100) == pytest.approx([52, 48])


def test_a_room_too_small_for_all_keeps_the_lowest_label_in_sight():
    placed = spread_labels([1, 1, 1], gap=10, low=0, high=15)
    assert sorted(placed) == [0, 10, 20]
