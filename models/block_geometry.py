"""The modes of each Gaussian block: where the prior and the polls' information are both diagonal.

Everything here is plain numpy and steers the sampler's coordinates only. A poor pilot costs speed, never
correctness: the tests change the pilot and find the same log density.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import CountedArrays, ElectionArrays, Floats, RowArrays
from models.lean_terms import lean_contrast, term_totals, weighted_contrast
from models.priors import Priors

# Pilot design effect: close to the prior medians of κ and ρ; only the sampler's coordinates depend on it.
PILOT_WEIGHTING_LOSS = 1.4
PILOT_ERROR_FLOOR = 0.0004


@dataclass(frozen=True)
class BlockGeometry:
    """One Gaussian block, its independent unit entries written as basis · modes.

    Attributes
    ----------
    basis
        Dims (entry, mode). Entries are the walks' steps in units of their scale, or the terms of the leans.
    information
        Information of the polls about each mode, dims (mode).
    crossing
        How information about the modes shifts when another field, given on the block's own grid,
        is added to what polls see: dims (mode, grid entry).
    """

    basis: Floats
    information: Floats
    crossing: Floats


@dataclass(frozen=True)
class Geometry:
    """The three Gaussian blocks; ``region`` is None with one region, ``lean`` where nothing tells rows apart.

    Attributes
    ----------
    region_contrast
        Turns R − 1 free contrasts into region deviations whose turnout-weighted mean is zero,
        dims (region, contrast).
    """

    national: BlockGeometry
    region: BlockGeometry | None
    lean: BlockGeometry | None
    region_contrast: Floats


@dataclass(frozen=True)
class _Sight:
    """How rows, then counted regions, see the blocks: row-wise knot and region weights and information."""

    national: Floats
    region: Floats
    mix: Floats
    leans: Floats
    weight: Floats


def build_geometry(arrays: ElectionArrays, *, priors: Priors) -> Geometry:
    """Find the modes of every block from the prior and a pilot of the polls' information."""
    knots = arrays.knots
    region_contrast = weighted_contrast(arrays.country.turnout)
    term_contrast = lean_contrast(arrays.leans, houses=len(arrays.rows.houses), priors=priors)
    sight = _sight(arrays, region_contrast, term_contrast)
    regional_walk = np.kron(
        _walk_root(knots.region_step + knots.region_jolt), np.eye(region_contrast.shape[1])
    )
    return Geometry(
        national=_block(
            design=sight.national[:, 1:] @ _walk_root(knots.national_step + knots.national_jolt),
            weight=sight.weight,
            grid=sight.national,
        ),
        region=_block(design=sight.region @ regional_walk, weight=sight.weight, grid=sight.mix)
        if region_contrast.shape[1]
        else None,
        lean=_block(design=sight.leans, weight=sight.weight, grid=sight.leans, spread=term_contrast)
        if term_contrast.shape[1]
        else None,
        region_contrast=region_contrast,
    )


def walk_sums(steps: int) -> Floats:
    """Turn steps into the walk after each, dims (knot − 1, step)."""
    return np.tri(steps)


def _walk_root(time: Floats) -> Floats:
    """Turn independent unit steps into a random walk after each of them, dims (knot − 1, step)."""
    return walk_sums(len(time)) * np.sqrt(time)


def _sight(arrays: ElectionArrays, region_contrast: Floats, term_contrast: Floats) -> _Sight:
    rows = arrays.rows
    share_of_row = rows.region_mix.sum(axis=1)
    parts = np.zeros((len(rows.respondents), len(rows.row_of_part)))
    parts[rows.row_of_part, np.arange(len(rows.row_of_part))] = 1
    totals = term_totals(arrays.leans, terms=len(term_contrast))
    seen = _Sight(
        national=(parts * share_of_row) @ rows.national_weight,
        region=parts @ _region_design(rows.region_weight, rows.region_mix, region_contrast),
        mix=parts @ rows.region_mix,
        leans=totals @ term_contrast,
        weight=_pilot_information(rows),
    )
    if arrays.counted is None:
        return seen
    return _with_counted(seen, arrays.counted, region_contrast)


def _with_counted(seen: _Sight, counted: CountedArrays, region_contrast: Floats) -> _Sight:
    count = len(counted.region)
    mix = np.eye(len(region_contrast))[counted.region]
    return _Sight(
        national=np.vstack([seen.national, counted.national_weight]),
        region=np.vstack([seen.region, _region_design(counted.region_weight, mix, region_contrast)]),
        mix=np.vstack([seen.mix, mix]),
        leans=np.vstack([seen.leans, np.zeros((count, seen.leans.shape[1]))]),
        weight=np.append(seen.weight, np.full(count, counted.people)),
    )


def _pilot_information(rows: RowArrays) -> Floats:
    return rows.respondents / (PILOT_WEIGHTING_LOSS + (rows.poll_respondents - 1) * PILOT_ERROR_FLOOR)


def _region_design(region_weight: Floats, mix: Floats, contrast: Floats) -> Floats:
    """How each row sees the regional walk, dims (row, (knot − 1) · contrast)."""
    seen = mix @ contrast
    return (region_weight[:, 1:, None] * seen[:, None, :]).reshape(len(seen), -1)


def _block(*, design: Floats, weight: Floats, grid: Floats, spread: Floats | None = None) -> BlockGeometry:
    """Diagonalise the information about independent unit entries; ``spread`` turns these into the field."""
    values, vectors = np.linalg.eigh((design.T * weight) @ design)
    basis = vectors if spread is None else spread @ vectors
    return BlockGeometry(
        basis=np.ascontiguousarray(basis),
        information=np.maximum(values, 1e-9),
        crossing=np.ascontiguousarray((design @ vectors).T * weight @ grid),
    )
