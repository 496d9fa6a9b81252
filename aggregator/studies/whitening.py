"""Errors of a whole set of shares in the posterior's own axes and units."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.stats import chi2

BAND = (0.005, 0.995)


@dataclass(frozen=True)
class PooledErrors:
    """Whitened errors of several elections taken together.

    Attributes
    ----------
    chi_square, degrees
        Sum of their squares, and how many they are.
    """

    chi_square: float
    degrees: int

    @property
    def band(self) -> tuple[float, float]:
        """Central 99 % of the chi-square distribution."""
        low, high = chi2.ppf(BAND, self.degrees)
        return float(low), float(high)

    @property
    def inside(self) -> bool:
        """Whether the sum lies in the band."""
        low, high = self.band
        return low < self.chi_square < high


def whitened_errors(
    draws: npt.NDArray[np.floating], truth: npt.NDArray[np.floating]
) -> npt.NDArray[np.float64]:
    """Errors of centred log shares in the posterior's own axes and units, dims (zero-sum coordinate).

    Standard normal and independent where the stated uncertainty is right, whatever the parties' errors have
    in common.

    Parameters
    ----------
    draws
        Shares, dims (sample, party).
    truth
        True shares, dims (party).
    """
    centred = np.log(draws) - np.log(draws).mean(axis=1, keepdims=True)
    error = np.log(truth) - np.log(truth).mean() - centred.mean(axis=0)
    values, vectors = np.linalg.eigh(np.cov(centred.T))
    # The first axis is the common level, which shares do not have.
    return np.asarray(vectors[:, 1:].T @ error / np.sqrt(values[1:]), dtype=float)


def pool_errors(errors: Iterable[npt.NDArray[np.float64]]) -> PooledErrors:
    """Take the whitened errors of several elections together."""
    together = np.concatenate(list(errors))
    return PooledErrors(chi_square=float((together**2).sum()), degrees=together.size)
