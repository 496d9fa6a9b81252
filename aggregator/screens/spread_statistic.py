r"""The statistic behind the screen of spreads, on arrays alone.

For the figures :math:`p_i` (d codes) of k polls

.. math:: X^2 = \sum_i (p_i - \bar p)^\top V_i^{-1} (p_i - \bar p) \sim \chi^2_{(k-1)d}, \qquad
          V_i = \mathrm{deff}_i \frac{\mathrm{diag}(\bar p) - \bar p \bar p^\top}{n_i} + \frac{g_i^2}{12} I,

:math:`\bar p` the mean weighted by :math:`V_i^{-1}` and g the step of rounding. For one code, d = 1, this is
:math:`\sum (p_i - \bar p)^2 / [\bar p (1 - \bar p)\,\mathrm{deff}_i / n_i]` with the variance of rounding
(Sheppard's correction) beside that of sampling.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd

Floats = npt.NDArray[np.float64]
Places = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

# With a coarser grid rounding hides the sampling: all polls print one number, and that says nothing. From
# half a step on, Sheppard's correction holds to within a few percent.
LEAST_SD_IN_STEPS = 0.5
# The chi-square distribution needs some answers in every cell (common practice).
LEAST_ANSWERS = 10.0


@dataclass(frozen=True)
class Answers:
    """Rows of the register as arrays.

    Attributes
    ----------
    codes
        Columns of ``share``.
    poll, row
        Identifier and row of the register, dims (row,).
    share
        Shares 0–1, NaN where not offered, dims (row, code).
    respondents, step
        Respondents, and step of rounding 0–1, dims (row,).
    """

    codes: tuple[str, ...]
    poll: tuple[str, ...]
    row: tuple[int, ...]
    share: Floats
    respondents: Floats
    step: Floats

    def free_codes(self, rows: Places, codes: Places) -> Places:
        """Leave the smallest codes out until what is left out has answers enough to be free.

        Figures that make up a whole are tied: the last one is what the others leave.
        """
        if not rows.size or not codes.size:
            return codes
        respondents = self.respondents[rows]
        answers = respondents @ self.share[np.ix_(rows, codes)] / len(rows)
        order = np.argsort(-answers, kind="stable")
        left_out = respondents.mean() - np.cumsum(answers[order])
        return np.sort(codes[order[left_out >= LEAST_ANSWERS]])


def read_answers(polls: pd.DataFrame, *, codes: Sequence[str]) -> Answers:
    """Take the arrays out of rows as ``DeskInputs.polls`` has them."""
    return Answers(
        codes=tuple(codes),
        poll=tuple(polls["poll"].astype(str)),
        row=tuple(int(row) for row in polls["row"]),
        share=polls[list(codes)].to_numpy(float) / 100,
        respondents=polls["respondents"].to_numpy(float),
        step=polls["rounding_step"].to_numpy(float) / 100,
    )


def window_spread(share: Floats, *, respondents: Floats, step: Floats) -> tuple[float, int]:
    """Spread of the polls of one window about their own mean.

    Parameters
    ----------
    share
        Shares 0–1 whose sum is free, dims (poll, code).
    respondents
        Respondents over design effect, dims (poll,).
    step
        Step of rounding 0–1, dims (poll,).

    Returns
    -------
    X² and its degrees of freedom.
    """
    middle = respondents @ share / respondents.sum()
    weight = np.linalg.inv(answer_variance(middle[None], respondents=respondents, step=step))
    return float(_spread(share, weight)), (len(share) - 1) * share.shape[1]


def _spread(share: Floats, weight: Floats) -> Floats:
    """X² of shares (…, poll, code) about their mean, each poll weighted by a matrix (poll, code, code)."""
    total = np.einsum("icd,...id->...c", weight, share)
    mean = np.linalg.solve(weight.sum(axis=0), total[..., None])[..., 0]
    apart = share - mean[..., None, :]
    return (apart * np.einsum("icd,...id->...ic", weight, apart)).sum(axis=(-2, -1))


def draw_window_spreads(
    middle: Floats,
    *,
    respondents: Floats,
    step: Floats,
    counted_step: Floats,
    draws: int,
    rng: np.random.Generator,
) -> Floats:
    """Draw X² of honest polls of one window, sampled and printed.

    Parameters
    ----------
    middle
        Shares 0–1 that all polls sample, dims (code,).
    respondents, step
        As for :func:`window_spread`.
    counted_step
        The step that the variance in X² counts, dims (poll,).

    Returns
    -------
    X², dims (draw,).
    """
    weight = np.linalg.inv(answer_variance(middle[None], respondents=respondents, step=counted_step))
    printed = draw_printed(middle[None], respondents=respondents, step=step, draws=draws, rng=rng)
    return _spread(printed, weight)


def draw_printed(
    share: Floats, *, respondents: Floats, step: Floats, draws: int, rng: np.random.Generator
) -> Floats:
    """Draw figures as they are printed: sampled, then rounded; dims (draw, poll, code).

    Parameters
    ----------
    share
        Shares 0–1, dims (poll or 1, code).
    respondents, step
        Dims (poll,).
    """
    root = np.linalg.cholesky(answer_variance(share, respondents=respondents, step=np.zeros_like(step)))
    noise = rng.normal(size=(draws, len(respondents), share.shape[-1]))
    figures = share + np.einsum("icd,nid->nic", root, noise)
    grid = step[:, None]
    return np.where(grid > 0, np.round(figures / np.where(grid > 0, grid, 1)) * grid, figures)


def spread_about(share: Floats, *, expected: Floats, respondents: Floats, step: float) -> Floats:
    """Spread of one poll about what it was expected to find, at each draw.

    Parameters
    ----------
    share
        Shares 0–1 whose sum is free, dims (code,) or (…, sample, code).
    expected
        Expected shares, dims (sample, code).
    respondents
        Respondents over design effect, dims (sample,).

    Returns
    -------
    X² with as many degrees of freedom as codes, dims (…, sample).
    """
    variance = answer_variance(expected, respondents=respondents, step=np.full(len(expected), step))
    apart = share - expected
    return (apart * np.linalg.solve(variance, apart[..., None])[..., 0]).sum(axis=-1)


def answer_variance(share: Floats, *, respondents: Floats, step: Floats) -> Floats:
    """Variance of sampling and rounding, dims (poll, code, code)."""
    eye = np.eye(share.shape[-1])
    sampling = share[..., :, None] * (eye - share[..., None, :])
    return sampling / respondents[..., None, None] + (step**2 / 12)[..., None, None] * eye


def shows_sampling(share: Floats, *, respondents: Floats, step: Floats) -> Flags:
    """Whether rounding leaves the sampling of each code to see in every poll, dims (code,).

    Parameters
    ----------
    share
        Mean shares 0–1, dims (code,).
    respondents, step
        Dims (poll,).
    """
    sd = np.sqrt(share * (1 - share) / respondents[:, None])
    enough = share * respondents[:, None] >= LEAST_ANSWERS
    return ((sd >= LEAST_SD_IN_STEPS * step[:, None]) & enough).all(axis=0)
