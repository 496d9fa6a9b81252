"""How voters move on when their party is out of a contest: rates with their uncertainty, draw by draw."""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.seats.rules import Float32Array, FloatArray

PERCENT = 100.0


def draw_transfers(
    transfers: pd.DataFrame, *, parties: tuple[str, ...], draws: int, rng: np.random.Generator
) -> Float32Array:
    """Draw the part of each party's voters that goes to each other party.

    A rate is a beta variate with the mean and standard deviation that the desk states, one for each ordered
    pair and draw, the same in all seats and on all dates. A rate without spread is taken as it is.

    Parameters
    ----------
    transfers
        One row per ordered pair of parties: ``from``, ``to``, ``rate`` and ``sd``, percent.
    parties
        Order of the parties.
    draws
        Number of draws.
    rng
        Source of randomness; pairs are drawn in the order of ``parties``.

    Returns
    -------
    numpy.ndarray
        dims (draw, from, to), 0–1; zero from a party to itself.

    Raises
    ------
    ValueError
        If a pair is missing, or no beta distribution has its mean and spread.
    """
    pairs = zip(transfers["from"], transfers["to"], strict=True)
    rates = (transfers[["rate", "sd"]].to_numpy(dtype=np.float64) / PERCENT).tolist()
    known = dict(zip(pairs, rates, strict=True))
    part = np.zeros((draws, len(parties), len(parties)), dtype=np.float32)
    for i, donor in enumerate(parties):
        for j, heir in enumerate(parties):
            if i == j:
                continue
            if (donor, heir) not in known:
                raise ValueError(f"No rate of transfer from {donor} to {heir}.")
            rate, sd = known[donor, heir]
            part[:, i, j] = draw_rates(rate, sd=sd, draws=draws, rng=rng)
    return part


def draw_rates(rate: float, *, sd: float, draws: int, rng: np.random.Generator) -> FloatArray:
    """Draw rates from the beta distribution of this mean and standard deviation, both 0–1."""
    if sd == 0:
        return np.full(draws, rate)
    both = rate * (1 - rate) / sd**2 - 1
    if both <= 0:
        raise ValueError(f"No beta distribution has mean {rate:g} and standard deviation {sd:g}.")
    return rng.beta(rate * both, (1 - rate) * both, draws)
