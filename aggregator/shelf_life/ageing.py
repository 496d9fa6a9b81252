r"""The arithmetic of ageing: what respondents of the past are worth in respondents of today.

Opinion moves while a poll lies on the shelf. A poll of n respondents says what support was; what it says
about support :math:`\Delta\tau` weeks later carries the sampling variance and the variance of the move in
between. A smaller poll taken on that later day would be just as precise: its size is what the old one is
worth.

Every function takes plain numbers or labelled arrays, one value per draw, and keeps their dims.
"""

from __future__ import annotations

from collections.abc import Sequence

import xarray as xr

from models.dimensions import PARTY


def share_variance(share: xr.DataArray, *, sd_log: xr.DataArray, members: Sequence[str]) -> xr.DataArray:
    r"""Variance of the summed share of some parties when every party's log-ratio moves on its own.

    .. math::

       s_S^2 = \sum_q \sigma_q^2 \left(\partial p_S / \partial x_q\right)^2, \qquad
       \partial p_S / \partial x_q = p_q (1[q \in S] - p_S)

    the first-order (delta) rule for the softmax :math:`p_q \propto e^{x_q}`. With
    :math:`\sigma_q = c / \sqrt{p_q}` it gives :math:`c^2 p_S (1 - p_S)` for every set S.

    Parameters
    ----------
    share
        Share of every party, 0–1, dims (..., party).
    sd_log
        Standard deviation of every party's log-ratio, dims (..., party): of its move per root of a week, or
        of a lean.
    members
        Codes of the parties that are summed; one code for a single party.

    Returns
    -------
    xr.DataArray
        Variance in squared share units, the dims of ``share`` and ``sd_log`` without party.
    """
    together = share.sel({PARTY: list(members)}).sum(PARTY)
    inside = share[PARTY].isin(list(members))
    return ((sd_log * share * (inside - together)) ** 2).sum(PARTY)


def fresh_worth[Quantity: (float, xr.DataArray)](
    sample: float, *, weeks: float | Quantity, share: Quantity, drift_variance: Quantity, kappa: Quantity
) -> Quantity:
    r"""Fresh respondents of the same house that would be worth as much as an old sample.

    .. math:: 1 / n_{fresh} = 1 / n + \Delta\tau\, s^2 / (\kappa\, p (1 - p))

    from equal precision about the later day: :math:`p(1-p)\kappa/n + \Delta\tau s^2 =
    p(1-p)\kappa/n_{fresh}`. The house's lean and its floor of error burden old and fresh respondents alike
    and cancel.

    Parameters
    ----------
    sample
        Respondents n of the old poll.
    weeks
        Opinion time between its fieldwork and the later day.
    share
        Share p of the party or alliance, 0–1.
    drift_variance
        Variance of that share per week, squared share units.
    kappa
        Loss to weighting of the house: variance over that of a simple random sample.
    """
    return 1.0 / (1.0 / sample + weeks * drift_variance / (kappa * share * (1.0 - share)))


def half_life_weeks[Quantity: (float, xr.DataArray)](
    sample: float, *, share: Quantity, drift_variance: Quantity, kappa: Quantity
) -> Quantity:
    r"""Age at which a poll is worth half its respondents: :math:`\kappa\, p(1-p) / (n s^2)` weeks.

    It is the age at which the variance of the move equals the sampling variance, so a large poll has a
    *shorter* half-life than a small one: it has more to lose.

    Parameters
    ----------
    sample, share, drift_variance, kappa
        As for `fresh_worth`.
    """
    return kappa * share * (1.0 - share) / (sample * drift_variance)
