"""Every number of a contest and its week, as data of the model: none is a constant of its graph."""

from __future__ import annotations

from typing import Any

import numpy as np
import pymc as pm

from models.arrays import ElectionArrays, KnotArrays
from models.block_geometry import Geometry, walk_sums
from models.free_baseline import free_directions, is_free
from models.poll_answers import kept_cells, small_counts
from models.priors import Priors
from models.row_shares import counted_data, part_data
from models.shared_lean import lean_loadings

Array = Any


def add_data(arrays: ElectionArrays, *, geometry: Geometry, priors: Priors) -> dict[str, Array]:
    """Put the numbers of the contest and the week into the current model, by name."""
    country, rows = arrays.country, arrays.rows
    values: dict[str, Any] = {
        "reference_share": country.reference_share,
        "pilot_share": country.pilot_share,
        "lean_size": country.lean_size,
        "start_log_share": country.start_log_share,
        "standing": country.standing.astype(float),
        "turnout": country.turnout,
        "free": free_directions(country),
        "is_free": is_free(country),
        "house_number": np.arange(len(rows.houses)),
        "house_of_row": rows.house_of_row,
        "respondents": rows.respondents,
        "poll_respondents": rows.poll_respondents,
        "weighting_known": rows.weighting_known,
        "partition": rows.partition,
        "answers_published": rows.answers,
        "used": rows.used,
        "kept": kept_cells(rows),
        **part_data(rows, with_regions=geometry.region is not None),
        **_walks(arrays.knots, geometry, priors, parties=len(country.parties)),
    }
    if geometry.lean is not None:
        values |= {
            "lean_basis": geometry.lean.basis,
            "lean_information": geometry.lean.information,
            "lean_pull": np.zeros((len(geometry.lean.information), len(country.parties))),
            "terms_of_row": arrays.leans.terms_of_row,
        }
    if len(rows.small_row):
        small = small_counts(rows)
        values |= {
            "small_row": rows.small_row,
            "small_cell": rows.small_cell,
            "small_count": small.counts,
            "small_log_weight": small.log_count_weight,
        }
    if arrays.counted is not None:
        values |= counted_data(arrays.counted, with_regions=geometry.region is not None)
    return {name: pm.Data(name, np.asarray(value, order="C")) for name, value in values.items()}


def _walks(knots: KnotArrays, geometry: Geometry, priors: Priors, *, parties: int) -> dict[str, Any]:
    """Time, lean clock and modes of the walks."""
    correlation = priors.lean_correlation
    values: dict[str, Any] = {
        "lean_loadings": lean_loadings(knots.lean_clock, correlation=correlation),
        "lean_loadings_reference": lean_loadings(np.array([knots.lean_reference]), correlation=correlation),
        "national_step": knots.national_step,
        "national_jolt": knots.national_jolt,
        "national_ramp": knots.national_ramp,
        "national_sums": walk_sums(len(knots.national_step)),
        "national_basis": geometry.national.basis,
        "national_information": geometry.national.information,
        "national_crossing": geometry.national.crossing,
        "national_pull": np.zeros((len(geometry.national.information), parties)),
    }
    if geometry.region is not None:
        values |= {
            "region_step": knots.region_step,
            "region_jolt": knots.region_jolt,
            "region_ramp": knots.region_ramp,
            "region_sums": walk_sums(len(knots.region_step)),
            "region_basis": geometry.region.basis,
            "region_information": geometry.region.information,
            "region_crossing": geometry.region.crossing,
            "region_pull": np.zeros((len(geometry.region.information), parties)),
            "region_contrast": geometry.region_contrast,
        }
    return values
