"""From support and leans to the shares each row of the register is expected to find."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytensor.tensor as pt

from models.arrays import CountedArrays, Floats, Indices, RowArrays

Array = Any


def part_data(rows: RowArrays, *, with_regions: bool) -> dict[str, Any]:
    """Index arrays that let parts with one region be computed apart from those with several."""
    asked = (rows.region_mix > 0).sum(axis=1)
    alone, several = np.flatnonzero(asked == 1), np.flatnonzero(asked > 1)
    weight = rows.region_weight if with_regions else np.ones((len(asked), 1))
    knot, knot_weight = nearest_knots(weight)
    return {
        "row_of_part": rows.row_of_part,
        "national_weight": rows.national_weight,
        "alone": alone,
        "several": several,
        "parts_of_row": _parts_of_row(rows, np.concatenate([alone, several])),
        "region_alone": rows.region_mix[alone].argmax(axis=1) if len(alone) else alone,
        "region_mix_alone": rows.region_mix[alone].sum(axis=1),
        "region_mix_several": rows.region_mix[several],
        "region_weight_several": weight[several],
        "region_knot": knot,
        "region_knot_weight": knot_weight,
    }


def counted_data(counted: CountedArrays, *, with_regions: bool) -> dict[str, Any]:
    """Arrays of the counted regions, as data of the model."""
    weight = counted.region_weight if with_regions else np.ones((len(counted.region), 1))
    knot, knot_weight = nearest_knots(weight)
    return {
        "counted_share": counted.share,
        "counted_people": np.array(counted.people),
        "counted_region": counted.region,
        "counted_national_weight": counted.national_weight,
        "counted_knot": knot,
        "counted_knot_weight": knot_weight,
    }


def nearest_knots(weight: Floats) -> tuple[Indices, Floats]:
    """The few knots that each line weighs, and their weights; dims (line, near knot)."""
    width = int((weight > 0).sum(axis=1).max())
    knot = np.argsort(-weight, axis=1, kind="stable")[:, :width]
    return knot, np.take_along_axis(weight, knot, axis=1)


def _parts_of_row(rows: RowArrays, order: Indices) -> Indices:
    """Where the parts of each row stand in ``order``, one past its end for none; dims (row, part of it)."""
    row_of_place = rows.row_of_part[order]
    by_row = np.argsort(row_of_place, kind="stable")
    count = np.bincount(rows.row_of_part, minlength=len(rows.respondents))
    first = np.repeat(np.cumsum(count) - count, count)
    slot = np.arange(len(order)) - first
    places = np.full((len(count), count.max()), len(order), dtype=np.int64)
    places[row_of_place[by_row], slot] = by_row
    return places


def row_shares(data: dict[str, Array], *, national: Array, region: Array, lean: Array | None) -> Array:
    """Expected shares of all parties in each row; dims (row, party).

    Parameters
    ----------
    data
        The model's data, :func:`part_data` among them.
    national
        What polls see nationally, at the national knots, dims (knot, party).
    region
        Each region's own support E at the regional knots, dims (knot, region, party).
    lean
        Leans of each row, log support, dims (row, party); None without any.
    """
    common = pt.dot(data["national_weight"], national)
    if lean is not None:
        common = common + lean[data["row_of_part"]]
    common = pt.exp(common)
    knot, weight = data["region_knot"], data["region_knot_weight"]
    knots, regions, parties = region.shape
    alone, several = data["alone"], data["several"]

    one = common[alone] * near_support(region, knot[alone], weight[alone], data["region_alone"])
    one = one * (data["region_mix_alone"] / one.sum(axis=-1))[:, None]

    # A product over all knots is faster here than fetching the few that a row weighs, region by region.
    own = pt.dot(data["region_weight_several"], region.reshape((knots, regions * parties)))
    own = own.reshape((-1, regions, parties))
    many = common[several][:, None, :] * own
    many = (many * (data["region_mix_several"] / many.sum(axis=-1))[:, :, None]).sum(axis=1)

    parts = pt.concatenate([one, many, pt.zeros_like(common[:1])], axis=0)
    places = data["parts_of_row"]
    return parts[places.ravel()].reshape((*places.shape, parties)).sum(axis=1)


def counted_shares(data: dict[str, Array], *, national: Array, region: Array) -> Array:
    """Support of each counted region on its polling day, without any lean; dims (counted, party)."""
    common = pt.exp(pt.dot(data["counted_national_weight"], national))
    own = near_support(region, data["counted_knot"], data["counted_knot_weight"], data["counted_region"])
    return common * own / (common * own).sum(axis=-1, keepdims=True)


def near_support(region: Array, knot: Array, weight: Array, where: Array) -> Array:
    """One region's own support on each line, between its nearest knots; dims (line, party)."""
    knots, regions, parties = region.shape
    at = knot * regions + where[:, None]
    near = region.reshape((knots * regions, parties))[at.ravel()].reshape((*at.shape, parties))
    return (near * weight[:, :, None]).sum(axis=1)
