"""Labels beside their marks, moved as little as possible so that none overlap."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import isotonic_regression


def spread_labels(wanted: ArrayLike, *, gap: float, low: float, high: float) -> NDArray[np.float64]:
    """Place labels at least ``gap`` apart, as near as possible to where they are wanted.

    With the labels in order, the i-th place minus i gaps must not fall: a least-squares fit under that
    constraint is isotonic regression. Of labels wanted at one place, the first comes out on top.

    Parameters
    ----------
    wanted
        Where each label should stand, shape (label,).
    gap
        Least distance of two labels, in the same unit.
    low, high
        Ends of the room; it is left at the upper end only if it is too small for all labels.

    Returns
    -------
    numpy.ndarray
        Shape (label,), in the order given.
    """
    values = np.asarray(wanted, dtype=np.float64)
    if values.size == 0:
        return values
    order = np.lexsort((-np.arange(values.size), values))
    steps = gap * np.arange(values.size)
    placed = isotonic_regression(values[order] - steps).x + steps
    # Pushed in from both ends, the lower end last: the lowest label stays in sight.
    placed = np.minimum(placed, high - steps[::-1])
    placed = np.maximum(placed, low + steps)
    result = np.empty_like(placed)
    result[order] = placed
    return result
