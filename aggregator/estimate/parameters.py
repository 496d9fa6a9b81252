"""From the sampler's flat draws to the model's parameters, with the same formulas as the model."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from aggregator.estimate.log_density import Layout
from models.arrays import ElectionArrays, Floats, KnotArrays
from models.block_geometry import BlockGeometry, Geometry
from models.conditional_laplace import answer_information, modes_from_coordinates
from models.free_baseline import free_directions, is_free
from models.lean_terms import term_total
from models.opinion_time import opinion_weeks
from models.party_scales import size_factor
from models.priors import Priors
from models.region_support import region_ratio
from models.shared_lean import lean_loadings, lean_scale


@dataclass(frozen=True)
class Parameters:
    """Draws of the model's parameters; leading dim (sample) throughout.

    Attributes
    ----------
    drift, house_scale, lean_scale
        Scales, dims (sample, party), unit: log support (drift per √week).
    region_ratio
        Regional over national drift, dims (sample); ones with one region.
    ramp
        Log height of the ramp of opinion time, dims (sample); zeros without one.
    walk
        National walk at the knots plus free national starts, leans left out, dims (sample, knot, party).
    region
        Regional deviations at the regional knots plus free regional starts, dims (sample, knot, region,
        party).
    lean
        Shared lean at the national knots, dims (sample, knot, party).
    terms
        Leans of houses, eras, modes, populations and formations, in the order of
        :class:`models.arrays.LeanArrays`, and a last one for none, dims (sample, term, party).
    kappa, rho
        Dims (sample, house).
    """

    drift: Floats
    house_scale: Floats
    lean_scale: Floats
    region_ratio: Floats
    ramp: Floats
    walk: Floats
    region: Floats
    lean: Floats
    terms: Floats
    kappa: Floats
    rho: Floats


def read_parameters(
    positions: Floats,
    *,
    layout: Layout,
    pulls: dict[str, Floats],
    arrays: ElectionArrays,
    geometry: Geometry,
    priors: Priors,
) -> Parameters:
    """Turn flat draws into parameters.

    Parameters
    ----------
    positions
        Dims (sample, coordinate).
    layout
        Where each variable lies in the vector.
    pulls
        The model's ``…_pull`` data after the pilot, by name.
    """
    country, knots, rows = arrays.country, arrays.knots, arrays.rows
    samples, parties = len(positions), len(country.parties)

    def part(name: str) -> Floats:
        return layout.part(positions, name)

    def scale(name: str, log_scale: Floats) -> Floats:
        own = priors.party_spread * part(f"{name}_own")
        return np.exp(log_scale[:, None] + own) * size_factor(country.reference_share)

    def modes(name: str, block: BlockGeometry, scale: Floats, beside: Floats | None) -> Floats:
        follow = (
            0.0 if beside is None else answer_information(block.crossing @ beside, share=country.pilot_share)
        )
        return modes_from_coordinates(
            part(f"{name}_modes"),
            scale=scale,
            information=block.information,
            share=country.pilot_share,
            pull=pulls[f"{name}_pull"] - follow,
        )

    ramp = part("ramp_log_height") if "ramp_log_height" in layout.names else np.zeros(samples)
    drift = scale("drift", part("drift_log"))
    house_scale = scale("house_scale", part("house_scale_log"))
    lean, lean_size, reference = _lean(part, layout, house_scale, arrays, priors)
    free = free_directions(country)
    start = np.zeros((samples, parties))
    if len(free):
        start = (priors.free_log_sd * part("free_baseline_own")) @ free
        start = start - reference * is_free(country)
    national = modes("national", geometry.national, drift, lean + start[:, None, :])
    walk = np.zeros((samples, len(knots.national_day), parties))
    walk[:, 1:] = np.cumsum(
        root_of_time(knots, "national", ramp) * (geometry.national.basis @ national), axis=1
    )
    region = np.zeros((samples, len(knots.region_day), len(country.regions), parties))
    ratio = np.ones(samples)
    if geometry.region is not None:
        region_start = None
        if len(free):
            region_start = (priors.free_region_log_sd * part("free_region_baseline_own")) @ free
            region += region_start[:, None]
        ratio = region_ratio(part("region_ratio_own"), priors=priors, exp=np.exp)
        steps = geometry.region.basis @ modes("region", geometry.region, drift * ratio[:, None], region_start)
        steps = root_of_time(knots, "region", ramp) * steps.reshape(samples, len(knots.region_step), -1)
        contrasts = np.cumsum(steps, axis=1).reshape(samples, len(knots.region_step), -1, parties)
        region[:, 1:] += geometry.region_contrast @ contrasts
    terms = np.zeros((samples, term_total(arrays.leans, houses=len(rows.houses)) + 1, parties))
    if geometry.lean is not None:
        terms[:, :-1] = geometry.lean.basis @ modes("lean", geometry.lean, house_scale, None)
    loss = part("weighting_loss_log")[:, None] + priors.weighting_loss_spread * part("weighting_loss_own")
    floor = part("error_floor_log")[:, None] + priors.error_floor_spread * part("error_floor_own")
    return Parameters(
        drift=drift,
        house_scale=house_scale,
        lean_scale=lean_size,
        region_ratio=ratio,
        ramp=ramp,
        walk=walk + start[:, None, :],
        region=region,
        lean=lean,
        terms=terms,
        kappa=1 + np.exp(loss),
        rho=np.exp(floor),
    )


def root_of_time(knots: KnotArrays, level: str, ramp: Floats) -> Floats:
    """Square root of the opinion time of each step, dims (sample, step, one)."""
    weeks = opinion_weeks(
        getattr(knots, f"{level}_step"),
        jolt=getattr(knots, f"{level}_jolt"),
        ramp=getattr(knots, f"{level}_ramp"),
        log_height=ramp[:, None],
        exp=np.exp,
    )
    return np.asarray(np.sqrt(weeks))[:, :, None]


def _lean(
    part: Callable[[str], Floats], layout: Layout, house_scale: Floats, arrays: ElectionArrays, priors: Priors
) -> tuple[Floats, Floats, Floats]:
    """The lean at the knots, its scale, and the lean at the register's middle."""
    knots = arrays.knots
    if "shared_lean_ends" not in layout.names:
        nothing = np.zeros_like(house_scale)
        return np.zeros((len(house_scale), len(knots.lean_clock), house_scale.shape[1])), nothing, nothing
    size = lean_scale(
        lean_size=arrays.country.lean_size,
        reference_share=arrays.country.reference_share,
        house_scale=house_scale,
        house_count=len(arrays.rows.houses),
    )
    ends = part("shared_lean_ends") * size[:, None, :]
    at_knots = lean_loadings(knots.lean_clock, correlation=priors.lean_correlation) @ ends
    reference = lean_loadings(np.array([knots.lean_reference]), correlation=priors.lean_correlation) @ ends
    return at_knots, size, reference[:, 0]
