"""The model's log density and gradient as one compiled function of one flat vector."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
import pymc as pm
import pytensor
import pytensor.tensor as pt

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

    @property
    def size(self) -> int:
        """Length of the flat vector."""
        return self.starts[-1] + int(np.prod(self.shapes[-1]))

    def part(self, vector: Floats, name: str) -> Floats:
        """One variable out of flat vectors, dims (…, its own)."""
        i = self.names.index(name)
        stop = self.starts[i] + int(np.prod(self.shapes[i]))
        return vector[..., self.starts[i] : stop].reshape(vector.shape[:-1] + self.shapes[i])

    def place(self, name: str) -> slice:
        """Where a variable lies in the flat vector."""
        i = self.names.index(name)
        return slice(self.starts[i], self.starts[i] + int(np.prod(self.shapes[i])))


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
        layout = self.layout
        parts = [
            vector[start : start + int(np.prod(shape))].reshape(shape) if shape else np.array(vector[start])
            for start, shape in zip(layout.starts, layout.shapes, strict=True)
        ]
        value, *gradients = self.compiled(*parts)
        gradient = np.empty(layout.size)
        for start, shape, part in zip(layout.starts, layout.shapes, gradients, strict=True):
            gradient[start : start + int(np.prod(shape))] = np.ravel(part)
        return float(value), gradient


def compile_log_density(model: pm.Model) -> LogDensity:
    """Compile log density and gradient of a model through numba.

    Every variable stays an input of its own: a flat input would put the sizes of this week's
    register into the graph as constants, and next week's would compile anew.
    """
    log_density = model.logp()
    inputs = model.value_vars
    # A list of inputs gives a list of gradients; the library's types leave that open.
    gradients = cast("list[Any]", pt.grad(log_density, inputs))
    compiled = pytensor.function(inputs, [log_density, *gradients], mode="NUMBA", on_unused_input="ignore")
    compiled.trust_input = True
    layout, start = _layout(model)
    return LogDensity(layout=layout, start=start, compiled=compiled)


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
