"""The model's log density and gradient as one compiled function of one flat vector."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from math import prod
from typing import Any, cast

import numpy as np
import pymc as pm
import pytensor
import pytensor.tensor as pt
from pytensor.compile.mode import Mode, get_mode

from models.arrays import Floats


@dataclass(frozen=True)
class Layout:
    """Where each unconstrained variable lies in the flat vector.

    Attributes
    ----------
    names
        Names of the model's variables, without the suffix of their transform.
    starts, shapes
        Start in the vector and shape of each.
    """

    names: tuple[str, ...]
    starts: tuple[int, ...]
    shapes: tuple[tuple[int, ...], ...]

    @cached_property
    def places(self) -> tuple[slice, ...]:
        """Where each variable lies in the flat vector."""
        return tuple(
            slice(start, start + prod(shape)) for start, shape in zip(self.starts, self.shapes, strict=True)
        )

    @property
    def size(self) -> int:
        """Length of the flat vector."""
        return self.places[-1].stop

    def part(self, vector: Floats, name: str) -> Floats:
        """One variable out of flat vectors, dims (…, its own)."""
        return vector[..., self.place(name)].reshape(vector.shape[:-1] + self.shapes[self.names.index(name)])

    def place(self, name: str) -> slice:
        """Where a variable lies in the flat vector."""
        return self.places[self.names.index(name)]


@dataclass(frozen=True)
class LogDensity:
    """Compiled log density of a model; call it with a flat vector for value and gradient.

    Attributes
    ----------
    layout
        Where each variable lies in the vector.
    start
        The model's initial point: prior medians of the scales, zero elsewhere; dims (coordinate).
    """

    layout: Layout
    start: Floats
    compiled: Callable

    def __call__(self, vector: Floats) -> tuple[float, Floats]:
        """Log density and its gradient, dims (coordinate)."""
        cuts = zip(self.layout.places, self.layout.shapes, strict=True)
        value, *gradients = self.compiled(*[vector[place].reshape(shape) for place, shape in cuts])
        return float(value), np.concatenate(gradients, axis=None)

    def laid_out_for(self, model: pm.Model) -> LogDensity:
        """Use the same compiled function for a model with the same graph and other sizes."""
        layout, start = _layout(model)
        return LogDensity(layout=layout, start=start, compiled=self.compiled)


def compile_log_density(model: pm.Model) -> LogDensity:
    """Compile log density and gradient of a model through numba.

    Every variable stays an input of its own: a flat input would put the sizes of this week's
    register into the graph as constants, and next week's would compile anew.
    """
    log_density = model.logp()
    inputs = model.value_vars
    # A list of inputs gives a list of gradients; the library's types leave that open.
    gradients = cast("list[Any]", pt.grad(log_density, inputs))
    compiled = pytensor.function(inputs, [log_density, *gradients], mode=_mode(), on_unused_input="ignore")
    compiled.trust_input = True
    layout, start = _layout(model)
    return LogDensity(layout=layout, start=start, compiled=compiled)


def _mode() -> Mode:
    """Numba without a pass that asks node by node which results may overwrite their inputs.

    It takes a third of the compilation and saves a thirtieth of an evaluation. Leave the other passes that
    write in place: without them gradients through repeated indices come out wrong in this version.
    """
    return get_mode("NUMBA").excluding("inplace_elemwise")


def _layout(model: pm.Model) -> tuple[Layout, Floats]:
    point = model.initial_point()
    values = [
        np.asarray(point[model.rvs_to_values[variable].name], dtype=float) for variable in model.free_RVs
    ]
    sizes = [value.size for value in values]
    layout = Layout(
        names=tuple(variable.name for variable in model.free_RVs),
        starts=tuple(int(at) for at in np.cumsum([0, *sizes[:-1]])),
        shapes=tuple(value.shape for value in values),
    )
    return layout, np.concatenate([value.ravel() for value in values])
