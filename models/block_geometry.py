"""The modes of each Gaussian block: where the prior and the polls' information are both diagonal.

Everything here is plain numpy and steers the sampler's coordinates only. A poor pilot costs speed, never
correctness: the tests change the pilot and find the same log density.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import ElectionArrays, Floats, RowArrays

# Pilot design effect: close to the prior medians of κ and ρ; only the sampler's coordinates depend on it.
PILOT_WEIGHTING_LOSS = 1.4
PILOT_ERROR_FLOOR = 0.0004


@dataclass(frozen=True)
class BlockGeometry:
    """One Gaussian block as field = basis · modes.

    Attributes
    ----------
    basis
        Dims (field entry, mode).
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
    """The three Gaussian blocks; ``region`` is None with one region, ``house`` with one house.

    Attributes
    ----------
    region_contrast
        Turns R − 1 free contrasts into region deviations whose turnout-weighted mean is zero,
        dims (region, contrast).
    house_contrast
        Turns H − 1 free contrasts into house effects that sum to zero, dims (house, contrast).
    """

    national: BlockGeometry
    region: BlockGeometry | None
    house: BlockGeometry | None
    region_contrast: Floats
    house_contrast: Floats


def build_geometry(arrays: ElectionArrays) -> Geometry:
    """Find the modes of every block from the prior and a pilot of the polls' information."""
    rows, knots, country = arrays.rows, arrays.knots, arrays.country
    weight = _pilot_information(rows)
    region_contrast = _weighted_contrast(country.turnout)
    house_contrast = _weighted_contrast(np.full(len(rows.houses), 1 / len(rows.houses)))
    national_design = rows.national_weight
    region_design = _region_design(rows, region_contrast)
    return Geometry(
        national=_block(
            design=national_design[:, 1:],
            precision_root=_walk_root(knots.national_step),
            weight=weight,
            grid=national_design,
        ),
        region=_block(
            design=region_design,
            precision_root=_per_contrast(_walk_root(knots.region_step), region_contrast.shape[1]),
            weight=weight,
            grid=rows.region_mix,
        )
        if region_contrast.shape[1]
        else None,
        house=_block(
            design=house_contrast[rows.house_of_row],
            precision_root=np.eye(house_contrast.shape[1]),
            weight=weight,
            grid=house_contrast[rows.house_of_row],
        )
        if house_contrast.shape[1]
        else None,
        region_contrast=region_contrast,
        house_contrast=house_contrast,
    )


def _pilot_information(rows: RowArrays) -> Floats:
    return rows.respondents / (PILOT_WEIGHTING_LOSS + (rows.poll_respondents - 1) * PILOT_ERROR_FLOOR)


def _weighted_contrast(weight: Floats) -> Floats:
    """Root C of M Mᵀ, M = I − 1 wᵀ: independent draws through C are deviations with weighted mean zero."""
    size = len(weight)
    centring = np.eye(size) - np.outer(np.ones(size), weight)
    values, vectors = np.linalg.eigh(centring @ centring.T)
    return vectors[:, 1:] * np.sqrt(np.maximum(values[1:], 0))


def _walk_root(step: Floats) -> Floats:
    """Rows of L turn a random walk without its first knot into independent unit steps."""
    size = len(step)
    return (np.eye(size) - np.eye(size, k=-1)) / np.sqrt(step)[:, None]


def _per_contrast(walk_root: Floats, contrasts: int) -> Floats:
    """Give every contrast the same walk, independent of the others'."""
    return np.asarray(np.kron(walk_root, np.eye(contrasts)), dtype=np.float64)


def _region_design(rows: RowArrays, contrast: Floats) -> Floats:
    """How each row sees the regional field, dims (row, (knot − 1) · contrast)."""
    seen = rows.region_mix @ contrast
    return (rows.region_weight[:, 1:, None] * seen[:, None, :]).reshape(len(seen), -1)


def _block(*, design: Floats, precision_root: Floats, weight: Floats, grid: Floats) -> BlockGeometry:
    """Solve the joint eigenproblem of prior precision LᵀL and information XᵀNX."""
    inverse = np.linalg.inv(precision_root)
    seen = design @ inverse
    values, vectors = np.linalg.eigh((seen.T * weight) @ seen)
    basis = inverse @ vectors
    return BlockGeometry(
        basis=np.ascontiguousarray(basis),
        information=np.maximum(values, 1e-9),
        crossing=np.ascontiguousarray((design @ basis).T * weight @ grid),
    )
