"""How far seats stray from their region, each by itself and together with its neighbours."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

LOCAL_SD = 0.15
LOCAL_TAIL = 4
"""Degrees of freedom of the local noise."""
CLUSTER_PART = 0.3
"""Part of the noise variance that the seats of a cluster share."""


def draw_local_sd(parties: int, *, log_sd: float, rng: np.random.Generator) -> np.ndarray:
    """Sd of each party's local noise, log points, dims (party,); ``log_sd`` says how far parties differ."""
    return LOCAL_SD * np.exp(log_sd * rng.normal(size=parties))


def draw_local_noise(
    local_sd: np.ndarray, *, seats: int, clusters: Sequence[str], rng: np.random.Generator
) -> np.ndarray:
    """Local noise of a region's seats, log points, dims (seat, party).

    Parameters
    ----------
    clusters
        Name of each seat's cluster, blank for none; empty where no seat has one.
    """
    noise = _unit_noise((seats, local_sd.size), rng=rng)
    if clusters:
        names, place = np.unique(clusters, return_inverse=True)
        shared = _unit_noise((names.size, local_sd.size), rng=rng)[place]
        in_cluster = np.array([name != "" for name in clusters])[:, None]
        together = np.sqrt(1 - CLUSTER_PART) * noise + np.sqrt(CLUSTER_PART) * shared
        noise = np.where(in_cluster, together, noise)
    return local_sd * noise


def _unit_noise(shape: tuple[int, int], *, rng: np.random.Generator) -> np.ndarray:
    # Scaled to unit variance: a Student t's own variance is df / (df - 2).
    return rng.standard_t(LOCAL_TAIL, size=shape) / np.sqrt(LOCAL_TAIL / (LOCAL_TAIL - 2))
