"""The election model: one hierarchical model of several polls over time, as a ``pm.Model``.

Support is θ_{r,t} ∝ exp(a_t) · E_{r,t} with E_{r,t} = exp(b_r + d_{r,t}): the national swing, and a region's
own support from its last result and its own swing, which leaves the country's sum of E as it was (see
:mod:`models.region_support`). Between knots a and E move in straight lines. Polls see
θ through the shared lean and the leans of their own, with their design effect.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt

from models.arrays import ElectionArrays
from models.block_geometry import Geometry
from models.conditional_laplace import add_modes, answer_information
from models.counted_regions import add_counts
from models.design_effect import add_design_effect_parameters, row_design_effect
from models.election_data import add_data
from models.free_baseline import add_free_baseline, add_free_region_baseline
from models.opinion_time import add_ramp, opinion_weeks
from models.party_scales import add_party_scale
from models.poll_answers import add_answers, add_small_cells, answer_precision, cell_shares
from models.priors import Priors
from models.region_support import add_region_ratio, own_support
from models.row_shares import counted_shares, row_shares
from models.shared_lean import add_shared_lean, lean_scale

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
    with pm.Model(coords=_coords(arrays)) as model:
        data = add_data(arrays, geometry=geometry, priors=priors)
        _add_growing_coords(model, arrays, geometry, data)
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
        ramp = add_ramp(priors=priors) if arrays.knots.has_ramp else 0.0
        lean = _shared_lean(data, house_scale) if shared_lean else None
        start, region_start = _start(arrays, data, lean, priors)
        national = _national_swing(data, drift, ramp, lean, start)
        region = _region_support(geometry, data, drift, ramp, region_start, priors)
        row_lean = _row_leans(geometry, data, house_scale)
        share = row_shares(data, national=national, region=region, lean=row_lean)
        kappa, rho = add_design_effect_parameters(priors=priors)
        _answers(arrays, data, share, kappa, rho)
        if arrays.counted is not None:
            true = national if lean is None else national - lean["at_knots"]
            add_counts(
                share=counted_shares(data, national=true, region=region),
                counted=data["counted_share"],
                people=data["counted_people"],
            )
    return model


def _coords(arrays: ElectionArrays) -> dict[str, Any]:
    return {
        "party": arrays.country.parties,
        "region": arrays.country.regions,
        "free_party": [arrays.country.parties[i] for i in arrays.country.free_party],
        "lean_end": ("last result", "towards polling day"),
    }


def _add_growing_coords(
    model: pm.Model, arrays: ElectionArrays, geometry: Geometry, data: dict[str, Array]
) -> None:
    """Add what may grow from week to week; its lengths are read off the data, so the graph stays as it is."""
    model.add_coord("house", arrays.rows.houses, length=data["house_number"].shape[0])
    for name, block in (
        ("national", geometry.national),
        ("region", geometry.region),
        ("lean", geometry.lean),
    ):
        if block is not None:
            modes = np.arange(len(block.information))
            model.add_coord(f"{name}_mode", modes, length=data[f"{name}_information"].shape[0])


def _shared_lean(data: dict[str, Array], house_scale: Array) -> dict[str, Array]:
    scale = lean_scale(
        lean_size=data["lean_size"],
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
    data: dict[str, Array], drift: Array, ramp: Array, lean: dict[str, Array] | None, start: Array | None
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
    steps = _root_of_time(data, "national", ramp)[:, None] * pt.dot(data["national_basis"], modes)
    walk = pt.dot(data["national_sums"], steps)
    walk = pt.concatenate([pt.zeros_like(walk[:1]), walk], axis=0)
    return walk + beside


def _root_of_time(data: dict[str, Array], level: str, ramp: Array) -> Array:
    """Square root of the opinion time of each step, dims (step)."""
    time = opinion_weeks(
        data[f"{level}_step"],
        jolt=data[f"{level}_jolt"],
        ramp=data[f"{level}_ramp"],
        log_height=ramp,
        exp=pt.exp,
    )
    return pt.sqrt(time)


def _region_support(
    geometry: Geometry,
    data: dict[str, Array],
    drift: Array,
    ramp: Array,
    region_start: Array | None,
    priors: Priors,
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
    root = _root_of_time(data, "region", ramp)
    steps = root[:, None] * pt.dot(data["region_basis"], modes).reshape((root.shape[0], -1))
    walk = pt.dot(data["region_sums"], steps).reshape((-1, contrast.shape[1], modes.shape[1]))
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


def _row_leans(geometry: Geometry, data: dict[str, Array], house_scale: Array) -> Array | None:
    """Leans of each row: of its house, era, mode, population and way of asking; dims (row, party)."""
    if geometry.lean is None:
        return None
    modes = add_modes(
        "lean_modes",
        scale=house_scale,
        information=data["lean_information"],
        share=data["pilot_share"],
        pull=data["lean_pull"],
        dims=("lean_mode", "party"),
    )
    terms = pt.dot(data["lean_basis"], modes)
    terms = pt.concatenate([terms, pt.zeros_like(terms[:1])], axis=0)
    places = data["terms_of_row"]
    return terms[places.ravel()].reshape((*places.shape, terms.shape[1])).sum(axis=1)


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
