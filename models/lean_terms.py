r"""What can make a house's figures differ from the average house's, term by term.

Beside the house itself: an era of its method, the mode of interview, a population other than the target, and
asking about an alliance as one. Every term is a vector over the parties in log support, and a row's lean is
the sum of its terms. All of them form one Gaussian block: a term's standard deviation is a fixed part of the
house scale, since no register has enough modes or populations to learn a scale of theirs.

What a term is measured against decides what it may move. Houses sum to zero. The eras of a house sum to zero
within it, so that a new label adds no vote of its house's. Modes have mean zero over houses, each house one
vote: a column that says how houses work must not move the truth. Populations are measured against the target
and asking about an alliance against naming its members: these may move it, and should.
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import block_diag

from models.arrays import Floats, LeanArrays
from models.priors import Priors


def term_starts(leans: LeanArrays, *, houses: int) -> dict[str, int]:
    """Number of the first term of each kind, and of ``none`` after the last."""
    counts = {
        "house": houses,
        "era": len(leans.eras),
        "mode": len(leans.modes),
        "population": len(leans.populations),
        "formation": len(leans.formations),
        "none": 1,
    }
    starts = np.cumsum([0, *counts.values()])[:-1]
    return dict(zip(counts, (int(s) for s in starts), strict=True))


def term_total(leans: LeanArrays, *, houses: int) -> int:
    """How many terms there are, ``none`` left out."""
    return term_starts(leans, houses=houses)["none"]


def lean_contrast(leans: LeanArrays, *, houses: int, priors: Priors) -> Floats:
    """Root of the terms' prior covariance in units of the house scale, dims (term, contrast).

    Independent standard normals through it are terms that keep the sums of this module.
    """
    eras = [
        priors.era_part * weighted_contrast(np.full(count, 1 / count))
        for count in np.unique(leans.era_house, return_counts=True)[1]
    ]
    parts = [
        weighted_contrast(np.full(houses, 1 / houses)),
        _placed(eras, leans),
        priors.mode_part * weighted_contrast(leans.mode_share),
        priors.population_part * np.eye(len(leans.populations)),
        priors.formation_part * np.eye(len(leans.formations)),
    ]
    return np.asarray(block_diag(*parts), dtype=np.float64)


def term_totals(leans: LeanArrays, *, terms: int) -> Floats:
    """How often each term stands in each row, dims (row, term)."""
    totals = np.zeros((len(leans.terms_of_row), terms + 1))
    np.add.at(totals, (np.arange(len(totals))[:, None], leans.terms_of_row), 1)
    return totals[:, :-1]


def weighted_contrast(weight: Floats) -> Floats:
    """Root C of M Mᵀ, M = I − 1 wᵀ: independent draws through C are deviations with weighted mean zero.

    Dims (entry, entry − 1).
    """
    size = len(weight)
    if size == 0:
        return np.zeros((0, 0))
    centring = np.eye(size) - np.outer(np.ones(size), weight)
    values, vectors = np.linalg.eigh(centring @ centring.T)
    return np.asarray(vectors[:, 1:] * np.sqrt(np.maximum(values[1:], 0)))


def _placed(of_house: list[Floats], leans: LeanArrays) -> Floats:
    """Contrasts within each house, in the order of the eras; dims (era, contrast)."""
    if not of_house:
        return np.zeros((0, 0))
    together = block_diag(*of_house)
    place = np.argsort(leans.era_house, kind="stable")
    placed = np.zeros_like(together)
    placed[place] = together
    return placed
