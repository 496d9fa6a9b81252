r"""How well draws foretold one number: proper scores, intervals, place of the truth among the draws.

The continuous ranked probability score and the kernel log score agree with the library `scoringrules` to
rounding, which a test checks. They are written out here because that library compiles its kernels at every
import, for seconds, in every worker.

References
----------
.. [1] Gneiting, T. and Raftery, A. E. (2007). Strictly proper scoring rules, prediction, and estimation.
   Journal of the American Statistical Association 102, 359–378. https://doi.org/10.1198/016214506000001437
.. [2] Czado, C., Gneiting, T. and Held, L. (2009). Predictive model assessment for count data. Biometrics
   65, 1254–1261. https://doi.org/10.1111/j.1541-0420.2009.01191.x
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.special import logsumexp

Floats = npt.NDArray[np.float64]

INTERVALS = (50, 80, 90, 95)
"""Central intervals that are scored, in percent."""


def score_crps(draws: Floats, truth: Floats) -> Floats:
    r"""Continuous ranked probability score, in the unit of the draws; smaller is better.

    .. math:: \frac1S\sum_i |x_i - y| - \frac1{2S^2}\sum_{i,j}|x_i - x_j|

    computed from the ordered draws. For a single number it is the absolute error.

    Parameters
    ----------
    draws
        Dims (draw, quantity).
    truth
        Dims (quantity).
    """
    size = draws.shape[0]
    ordered = np.sort(draws, axis=0)
    level = (np.arange(size) + 0.5)[:, None] / size
    return 2.0 * ((ordered - truth) * ((truth < ordered) - level)).mean(axis=0)


def score_log(draws: Floats, truth: Floats, *, least_bandwidth: float = 0.0) -> Floats:
    """Negative log density of the truth under the draws, each spread by a Gaussian kernel.

    The bandwidth is Silverman's rule, 1.06 min(sd, IQR/1.34) S^(-1/5).

    Parameters
    ----------
    draws
        Dims (draw, quantity).
    truth
        Dims (quantity).
    least_bandwidth
        The least spread: half a seat where draws are whole seats, so that the score is that of a whole
        number's chance. Where it is zero, constant draws have no density: NaN.
    """
    size = draws.shape[0]
    low, high = np.quantile(draws, [0.25, 0.75], axis=0)
    spread = np.minimum(draws.std(axis=0, ddof=1), (high - low) / 1.34)
    bandwidth = np.maximum(1.06 * spread * size ** (-1 / 5), least_bandwidth)
    bandwidth = np.where(bandwidth > 0, bandwidth, np.nan)
    distance = (draws - truth) / bandwidth
    return -(logsumexp(-(distance**2) / 2, axis=0) - np.log(size * bandwidth * np.sqrt(2 * np.pi)))


def central_intervals(draws: Floats, *, whole: bool) -> dict[int, tuple[Floats, Floats]]:
    """Ends of the central intervals, by their percentage.

    Parameters
    ----------
    draws
        Dims (draw, quantity).
    whole
        Whether draws are whole numbers, and so are the ends; the interval then holds at least its share.
    """
    ends = {}
    for percent in INTERVALS:
        tail = (1 - percent / 100) / 2
        method = "inverted_cdf" if whole else "linear"
        low, high = np.quantile(draws, [tail, 1 - tail], axis=0, method=method)  # type: ignore[call-overload]
        ends[percent] = (low, high)
    return ends


def place_of_truth(draws: Floats, truth: Floats, *, rng: np.random.Generator) -> Floats:
    """Randomised probability integral transform: uniform on 0–1 if draws and truth are exchangeable.

    (k + V (t + 1)) / (S + 1), with k draws below the truth, t equal to it, and V uniform. For whole numbers
    such as seats that spreads the truth over its own step.

    Parameters
    ----------
    draws
        Dims (draw, quantity).
    truth
        Dims (quantity).
    rng
        Source of V.
    """
    below, equal = (draws < truth).sum(axis=0), (draws == truth).sum(axis=0)
    return (below + rng.uniform(size=truth.shape) * (equal + 1)) / (draws.shape[0] + 1)
