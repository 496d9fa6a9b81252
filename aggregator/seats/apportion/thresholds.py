"""Which parties may have list seats: thresholds, joint lists, exemptions."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from aggregator.seats.apportion.joint_lists import check_lists

# Shares of whole votes that differ from a threshold of a few decimals differ by more than this part of it in
# any real election; sums of shares carry rounding that is far smaller.
_ROUNDING = 1e-12


def passes_threshold(
    shares: npt.NDArray[np.float64],
    *,
    threshold: float,
    exempt: npt.NDArray[np.bool_] | None = None,
    lists: Sequence[Sequence[int]] = (),
    alliance_threshold: float | None = None,
) -> npt.NDArray[np.bool_]:
    """Say who reaches the threshold, row by row.

    Parameters
    ----------
    shares
        dims (row, party), 0–1: shares of the whole vote, where the threshold applies.
    threshold
        Share, 0–1, that a party needs: at or above it passes.
    exempt
        dims (party,): who needs no threshold; default nobody. A joint list is exempt if all its members are.
    lists
        Positions of the parties of each joint list: it passes or fails as one, on the sum of its shares.
    alliance_threshold
        Share that a joint list needs; default as ``threshold``.

    Returns
    -------
    numpy.ndarray
        dims (row, party). Where nobody passes, the row has no threshold: all pass, for seats must be filled
        (laws differ; many lower the threshold then).

    Raises
    ------
    ValueError
        If a threshold is not a share below 1, ``exempt`` is not one per party, or joint lists overlap or
        name no party.
    """
    for name, value in (("threshold", threshold), ("alliance_threshold", alliance_threshold)):
        if value is not None and not 0 <= value < 1:
            raise ValueError(f"{name}: got {value}; expected a share, 0 or more and below 1")
    check_lists(lists, n_parties=shares.shape[1])
    if exempt is not None and exempt.shape != shares.shape[1:]:
        raise ValueError(f"exempt: got shape {exempt.shape}; expected {shares.shape[1:]}, one per party")
    free = np.zeros(shares.shape[1], dtype=np.bool_) if exempt is None else np.asarray(exempt)
    passes = (shares >= threshold * (1 - _ROUNDING)) | free
    needed = threshold if alliance_threshold is None else alliance_threshold
    for members in map(list, lists):
        together = shares[:, members].sum(axis=1) >= needed * (1 - _ROUNDING)
        passes[:, members] = (together | free[members].all())[:, None]
    return passes | ~passes.any(axis=1, keepdims=True)
