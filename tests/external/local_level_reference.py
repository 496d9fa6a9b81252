"""One party's support as a daily random walk seen through houses that lean: exact Gaussian likelihood.

The model of Jackman 2005 (Australian Journal of Political Science 40(4):499-517; from memory):

    y_i = alpha[t_i] + delta[h_i] + e_i,    e_i ~ N(0, y_i (100 - y_i) / n_i + extra²),
    alpha[t] = alpha[t-1] + omega N(0, 1),

with alpha known on the day of an election. Likelihood, filter and smoother are those of
``statsmodels.tsa.statespace``; several polls may fall on one day, which is why the steps of the state
space are polls, not days, and the state's variance grows with the days between them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from scipy.optimize import minimize
from statsmodels.tsa.statespace.mlemodel import MLEModel


@dataclass(frozen=True)
class LocalLevel:
    """A fitted walk.

    Attributes
    ----------
    omega
        Sd of a day's step, points.
    extra
        Sd of a poll beyond its sampling error, points.
    houses
        Lean of each house in points, with its standard error at the fitted scales: columns lean, se.
    forecast, forecast_sd
        Support on the last day, points; the sd holds the scales fixed and counts the leans' errors.
    """

    omega: float
    extra: float
    houses: pd.DataFrame
    forecast: float
    forecast_sd: float


class _LevelWithLeans(MLEModel):
    """Observed shares, one step per poll; the leans enter as known intercepts."""

    def __init__(self, share: np.ndarray, *, variance: np.ndarray, gap: np.ndarray, start: float) -> None:
        super().__init__(share, k_states=1, k_posdef=1)
        self.variance, self.gap = variance, gap
        self["design", 0, 0] = self["transition", 0, 0] = self["selection", 0, 0] = 1.0
        self.initialize_known(np.array([start]), np.array([[0.0]]))

    def set_scales(self, *, omega: float, extra: float, anchored: np.ndarray) -> None:
        # The step into poll i + 1 stands at position i; the first poll comes after a first, empty step.
        self["state_cov"] = (omega**2 * np.append(self.gap[1:], 0.0))[None, None]
        self["obs_cov"] = np.where(anchored, 1e-10, self.variance + extra**2)[None, None]


def fit_local_level(
    polls: pd.DataFrame,
    *,
    start: tuple[pd.Timestamp, float],
    end: tuple[pd.Timestamp, float | None],
    with_extra: bool,
) -> LocalLevel:
    """Fit scales and leans by maximum likelihood.

    Parameters
    ----------
    polls
        Columns day, house, share (points), sample; any order.
    start
        Day and known support of the first election.
    end
        Last day and, where it is known and anchors the walk, its support. Where it is not, the leans
        sum to zero over houses.
    with_extra
        Whether polls stray beyond their sampling error.
    """
    ordered = polls.sort_values("day", kind="stable")
    houses = sorted(polls["house"].unique())
    first = pd.DataFrame({"day": [start[0]], "share": [start[1]], "house": "", "sample": np.nan})
    last = pd.DataFrame({"day": [end[0]], "share": [end[1]], "house": "", "sample": np.nan})
    steps = pd.concat([first, ordered[first.columns], last.astype(first.dtypes)], ignore_index=True)
    share = steps["share"].to_numpy(float)
    anchored = steps["house"].eq("").to_numpy()
    variance = np.nan_to_num(share * (100 - share) / steps["sample"].to_numpy(float))
    gap = np.append(0.0, np.diff(steps["day"].to_numpy()) / np.timedelta64(1, "D"))
    model = _LevelWithLeans(share, variance=variance, gap=gap, start=start[1])
    design = (steps["house"].to_numpy()[:, None] == np.array(houses)).astype(float)
    if end[1] is None:
        # Zero-sum coordinates: each lean but the last free, the last what makes the sum zero.
        to_leans = np.vstack([np.eye(len(houses) - 1), -np.ones(len(houses) - 1)])
    else:
        to_leans = np.eye(len(houses))

    def scales(parameters: np.ndarray) -> tuple[float, float]:
        return float(np.exp(parameters[0])), float(np.exp(parameters[1])) if with_extra else 0.0

    def loss(parameters: np.ndarray) -> float:
        omega, extra = scales(parameters)
        model.set_scales(omega=omega, extra=extra, anchored=anchored)
        leans = to_leans @ parameters[2 if with_extra else 1 :]
        model["obs_intercept"] = (design @ leans)[None]
        return -float(model.ssm.loglike())

    begin = np.append(np.log([0.3, 0.9]) if with_extra else np.log([0.3]), np.zeros(to_leans.shape[1]))
    found = minimize(loss, begin, method="L-BFGS-B", options={"maxfun": 20_000, "ftol": 1e-12, "gtol": 1e-6})
    loss(found.x)
    omega, extra = scales(found.x)
    free = found.x[2 if with_extra else 1 :]
    forecast, forecast_sd = _last_state(model, leans=free, design=design @ to_leans)
    free_covariance, sensitivity = _lean_errors(model, found=free, design=design @ to_leans)
    covariance = to_leans @ free_covariance @ to_leans.T
    return LocalLevel(
        omega=omega,
        extra=extra,
        houses=pd.DataFrame(
            {"lean": to_leans @ free, "se": np.sqrt(np.diag(covariance))},
            index=pd.Index(houses, name="house"),
        ),
        forecast=forecast,
        forecast_sd=float(np.sqrt(forecast_sd**2 + sensitivity @ free_covariance @ sensitivity)),
    )


def _last_state(model: MLEModel, *, leans: np.ndarray, design: np.ndarray) -> tuple[float, float]:
    model["obs_intercept"] = (design @ leans)[None]
    smoothed = model.ssm.smooth()
    variance = float(smoothed.smoothed_state_cov[0, 0, -1])
    return float(smoothed.smoothed_state[0, -1]), float(np.sqrt(max(variance, 0.0)))


def _lean_errors(model: MLEModel, *, found: np.ndarray, design: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Covariance of the leans at fixed scales, and how the last state moves with each.

    The log-likelihood is quadratic and the state linear in the leans, so differences are exact.
    """

    def loglike(leans: np.ndarray) -> float:
        model["obs_intercept"] = (design @ leans)[None]
        return float(model.ssm.loglike())

    unit = np.eye(found.size)
    hessian = np.empty((found.size, found.size))
    for i, j in np.ndindex(hessian.shape):
        hessian[i, j] = (
            loglike(found + unit[i] + unit[j])
            - loglike(found + unit[i] - unit[j])
            - loglike(found - unit[i] + unit[j])
            + loglike(found - unit[i] - unit[j])
        ) / 4
    at_found = _last_state(model, leans=found, design=design)[0]
    sensitivity = [_last_state(model, leans=found + step, design=design)[0] - at_found for step in unit]
    return np.linalg.inv(-hessian), np.array(sensitivity)
