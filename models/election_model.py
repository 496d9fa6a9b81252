"""The election model: one hierarchical model of several polls over time, as a ``pm.Model``.

Support is θ_{r,t} ∝ exp(a_t) · E_{r,t} with E_{r,t} = exp(b_r + d_{r,t}): the national swing, and a region's
own support from its last result and its own swing, which leaves the country's sum of E as it was (see
:mod:`models.region_support`). Between knots a and E move in straight lines. Polls see
θ through the shared lean and their house's lean, with their design effect.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt

from models.arrays import ElectionArrays, Floats, Indices
from models.block_geometry import Geometry
from models.conditional_laplace import add_modes, answer_information
from models.design_effect import add_design_effect_parameters, row_design_effect
from models.free_baseline import (
    add_free_baseline,
    add_free_region_baseline,
    free_directions,
    is_free,
)
from models.party_scales import add_party_scale
from models.poll_answers import (
    add_answers,
    add_small_cells,
    answer_precision,
    cell_shares,
    kept_cells,
    small_counts,
)
from models.priors import Priors
from models.region_support import add_region_ratio, own_support
from models.shared_lean import add_shared_lean, lean_loadings, lean_scale

Array = Any


def build_election_model(
    arrays: ElectionArrays, *, geometry: Geometry, priors: Priors, shared_lean: bool = True
) -> pm.Model:
    """Build the model of one contest.

    All numbers of the contest and of the week enter as ``pm.Data``, so that another week's polls change
    no constant of the graph.

    Parameters
    ----------
    arrays
        The contest and its polls.
    geometry
        Modes of the Gaussian blocks, from :func:`models.block_geometry.build_geometry`.
    priors
        Prior scales.
    shared_lean
        Whether polls may share an error; without it intervals for true support are far too narrow.

    Raises
    ------
    ModelInputError
        If the arrays contradict each other.
    """
    arrays.check()
    with pm.Model(coords=_coords(arrays, geometry)) as model:
        data = _add_data(arrays, geometry, priors)
        # The count of houses is read off the data: a new house must not change the graph.
        model.add_coord("house", arrays.rows.houses, length=data["house_number"].shape[0])
        drift = add_party_scale(
            "drift",
            log_median=priors.drift_log_median,
            log_sd=priors.drift_log_sd,
            spread=priors.party_spread,
            reference_share=data["reference_share"],
        )
        house_scale = add_party_scale(
            "house_scale",
            log_median=priors.house_log_median,
            log_sd=priors.house_log_sd,
            spread=priors.party_spread,
            reference_share=data["reference_share"],
        )
        lean = _lean(data, house_scale, priors) if shared_lean else None
        start, region_start = _start(arrays, data, lean, priors)
        national = _national_swing(data, drift, lean, start)
        region = _region_support(geometry, data, drift, region_start, priors)
        house = _house_effects(geometry, data, house_scale)
        share = _row_shares(data, national, region, house)
        kappa, rho = add_design_effect_parameters(priors=priors)
        _answers(arrays, data, share, kappa, rho)
    return model


def _coords(arrays: ElectionArrays, geometry: Geometry) -> dict[str, Any]:
    coords: dict[str, Any] = {
        "party": arrays.country.parties,
        "region": arrays.country.regions,
        "free_party": [arrays.country.parties[i] for i in arrays.country.free_party],
        "lean_end": ("last result", "towards polling day"),
        "national_mode": np.arange(len(geometry.national.information)),
    }
    if geometry.region is not None:
        coords["region_mode"] = np.arange(len(geometry.region.information))
    if geometry.house is not None:
        coords["house_mode"] = np.arange(len(geometry.house.information))
    return coords


def _add_data(arrays: ElectionArrays, geometry: Geometry, priors: Priors) -> dict[str, Array]:
    """Every number of the contest and the week, by name."""
    country, knots, rows = arrays.country, arrays.knots, arrays.rows
    asked = (rows.region_mix > 0).sum(axis=1)
    alone, several = np.flatnonzero(asked == 1), np.flatnonzero(asked > 1)
    region_knot, region_knot_weight = _nearest_knots(
        rows.region_weight if geometry.region is not None else np.ones((len(asked), 1))
    )
    values: dict[str, Any] = {
        "reference_share": country.reference_share,
        "pilot_share": country.pilot_share,
        "start_log_share": country.start_log_share,
        "standing": country.standing.astype(float),
        "turnout": country.turnout,
        "free": free_directions(country),
        "is_free": is_free(country),
        "national_weight": rows.national_weight,
        "house_number": np.arange(len(rows.houses)),
        "house_of_row": rows.house_of_row,
        "respondents": rows.respondents,
        "poll_respondents": rows.poll_respondents,
        "weighting_known": rows.weighting_known,
        "partition": rows.partition,
        "answers_published": rows.answers,
        "used": rows.used,
        "kept": kept_cells(rows),
        "alone": alone,
        "several": several,
        "row_order": np.argsort(np.concatenate([alone, several])),
        "region_alone": rows.region_mix[alone].argmax(axis=1) if len(alone) else alone,
        "region_mix_several": rows.region_mix[several],
        "region_knot": region_knot,
        "region_knot_weight": region_knot_weight,
        "lean_loadings": lean_loadings(knots.lean_clock, correlation=priors.lean_correlation),
        "lean_loadings_reference": lean_loadings(
            np.array([knots.lean_reference]), correlation=priors.lean_correlation
        ),
        "shared_lean_size": np.array(priors.shared_lean),
        "national_basis": geometry.national.basis,
        "national_information": geometry.national.information,
        "national_crossing": geometry.national.crossing,
        "national_pull": np.zeros((len(geometry.national.information), len(country.parties))),
    }
    if geometry.region is not None:
        values |= {
            "region_basis": geometry.region.basis,
            "region_information": geometry.region.information,
            "region_crossing": geometry.region.crossing,
            "region_pull": np.zeros((len(geometry.region.information), len(country.parties))),
            "region_contrast": geometry.region_contrast,
        }
    if geometry.house is not None:
        values |= {
            "house_basis": geometry.house_contrast @ geometry.house.basis,
            "house_information": geometry.house.information,
            "house_pull": np.zeros((len(geometry.house.information), len(country.parties))),
        }
    if len(rows.small_row):
        small = small_counts(rows)
        values |= {
            "small_row": rows.small_row,
            "small_cell": rows.small_cell,
            "small_count": small.counts,
            "small_log_weight": small.log_count_weight,
        }
    return {name: pm.Data(name, np.asarray(value, order="C")) for name, value in values.items()}


def _nearest_knots(weight: Floats) -> tuple[Indices, Floats]:
    """The few knots each row weighs, and their weights; dims (row, near knot)."""
    width = int((weight > 0).sum(axis=1).max())
    knot = np.argsort(-weight, axis=1, kind="stable")[:, :width]
    return knot, np.take_along_axis(weight, knot, axis=1)


def _lean(data: dict[str, Array], house_scale: Array, priors: Priors) -> dict[str, Array]:
    scale = lean_scale(
        shared_lean=data["shared_lean_size"],
        reference_share=data["reference_share"],
        house_scale=house_scale,
        house_count=data["house_number"].shape[0],
    )
    at_knots = add_shared_lean(loadings=data["lean_loadings"], scale=scale)
    ends = pm.modelcontext(None)["shared_lean_ends"]
    return {"at_knots": at_knots, "at_reference": pt.dot(data["lean_loadings_reference"], ends * scale)[0]}


def _start(
    arrays: ElectionArrays, data: dict[str, Array], lean: dict[str, Array] | None, priors: Priors
) -> tuple[Array | None, Array | None]:
    """True start of the free parties: national dims (party), and by region dims (region, party)."""
    if not len(arrays.country.free_party):
        return None, None
    start = add_free_baseline(free=data["free"], log_sd=priors.free_log_sd)
    if lean is not None:
        start = start - lean["at_reference"] * data["is_free"]
    if len(arrays.country.regions) == 1:
        return start, None
    return start, add_free_region_baseline(free=data["free"], log_sd=priors.free_region_log_sd)


def _national_swing(
    data: dict[str, Array], drift: Array, lean: dict[str, Array] | None, start: Array | None
) -> Array:
    """What polls see nationally beside the regions: walk, lean and free starts; dims (knot, party)."""
    beside = 0.0
    if lean is not None:
        beside = beside + lean["at_knots"]
    if start is not None:
        beside = beside + start[None, :]
    pull = data["national_pull"]
    if lean is not None or start is not None:
        beside = beside + pt.zeros_like(data["lean_loadings"][:, 0])[:, None]
        # Polls see walk + lean + start: the walk's coordinates follow the others, or there is a ridge.
        pull = pull - answer_information(pt.dot(data["national_crossing"], beside), share=data["pilot_share"])
    modes = add_modes(
        "national_modes",
        scale=drift,
        information=data["national_information"],
        share=data["pilot_share"],
        pull=pull,
        dims=("national_mode", "party"),
    )
    walk = pt.dot(data["national_basis"], modes)
    walk = pt.concatenate([pt.zeros_like(walk[:1]), walk], axis=0)
    return walk + beside


def _region_support(
    geometry: Geometry, data: dict[str, Array], drift: Array, region_start: Array | None, priors: Priors
) -> Array:
    """Each region's own support E at the regional knots, zero where absent; dims (knot, region, party)."""
    own = 0.0 if region_start is None else region_start[None]
    if geometry.region is None:
        return _own_support(data, own + pt.zeros_like(data["start_log_share"])[None])
    ratio = add_region_ratio(priors=priors)
    pull = data["region_pull"]
    if region_start is not None:
        pull = pull - answer_information(
            pt.dot(data["region_crossing"], region_start), share=data["pilot_share"]
        )
    modes = add_modes(
        "region_modes",
        scale=drift * ratio,
        information=data["region_information"],
        share=data["pilot_share"],
        pull=pull,
        dims=("region_mode", "party"),
    )
    contrast = data["region_contrast"]
    walk = pt.dot(data["region_basis"], modes).reshape((-1, contrast.shape[1], modes.shape[1]))
    swing = pt.dot(walk.dimshuffle(0, 2, 1), contrast.T).dimshuffle(0, 2, 1)
    swing = pt.concatenate([pt.zeros_like(swing[:1]), swing], axis=0)
    return _own_support(data, own + swing)


def _own_support(data: dict[str, Array], own: Array) -> Array:
    return own_support(
        own,
        start_share=data["standing"] * pt.exp(data["start_log_share"]),
        turnout=data["turnout"],
        exp=pt.exp,
    )


def _house_effects(geometry: Geometry, data: dict[str, Array], house_scale: Array) -> Array | None:
    """House effects, dims (house, party), zero-sum over houses."""
    if geometry.house is None:
        return None
    modes = add_modes(
        "house_modes",
        scale=house_scale,
        information=data["house_information"],
        share=data["pilot_share"],
        pull=data["house_pull"],
        dims=("house_mode", "party"),
    )
    return pt.dot(data["house_basis"], modes)


def _row_shares(data: dict[str, Array], national: Array, region: Array, house: Array | None) -> Array:
    """Expected shares of all parties in each row, leans included; dims (row, party)."""
    common = pt.dot(data["national_weight"], national)
    if house is not None:
        common = common + house[data["house_of_row"]]
    common = pt.exp(common)
    knot, weight = data["region_knot"], data["region_knot_weight"]
    knots, regions, parties = region.shape
    alone, several = data["alone"], data["several"]

    at = knot[alone] * regions + data["region_alone"][:, None]
    near = region.reshape((knots * regions, parties))[at.ravel()].reshape((*at.shape, parties))
    one = common[alone] * (near * weight[alone][:, :, None]).sum(axis=1)
    one = one / one.sum(axis=-1, keepdims=True)

    at = knot[several]
    near = region.reshape((knots, regions * parties))[at.ravel()].reshape((*at.shape, regions * parties))
    own = (near * weight[several][:, :, None]).sum(axis=1).reshape((-1, regions, parties))
    many = common[several][:, None, :] * own
    many = (many * (data["region_mix_several"] / many.sum(axis=-1))[:, :, None]).sum(axis=1)
    return pt.concatenate([one, many], axis=0)[data["row_order"]]


def _answers(arrays: ElectionArrays, data: dict[str, Array], share: Array, kappa: Array, rho: Array) -> None:
    cells = cell_shares(share, partition=data["partition"], used=data["used"])
    deff = row_design_effect(
        kappa=kappa,
        rho=rho,
        house_of_row=data["house_of_row"],
        poll_respondents=data["poll_respondents"],
        weighting_known=data["weighting_known"],
    )
    precision = answer_precision(respondents=data["respondents"], design_effect=deff, larger=pt.maximum)
    add_answers(answers=data["answers_published"], cells=cells, precision=precision, kept=data["kept"])
    if len(arrays.rows.small_row):
        row, cell = data["small_row"], data["small_cell"]
        add_small_cells(
            counts=data["small_count"],
            log_count_weight=data["small_log_weight"],
            weight=precision[row] * cells[row, cell],
            precision=precision[row],
            respondents=data["respondents"][row],
        )
