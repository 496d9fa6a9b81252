"""A contest's model, compiled and centred on its pilot: ready to be sampled at any length."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import pymc as pm
import xarray as xr

from aggregator.estimate.log_density import LogDensity, compile_log_density
from aggregator.estimate.parameters import Parameters, read_parameters
from aggregator.estimate.pilot import centre_on_pilot
from aggregator.estimate.sampling import ChainPlan, sample_chains
from models.arrays import ElectionArrays, Floats
from models.block_geometry import Geometry, build_geometry
from models.election_model import build_election_model
from models.priors import Priors

PULLS = ("national_pull", "region_pull", "lean_pull")


@dataclass(frozen=True)
class CompiledElection:
    """The model of one contest with its compiled log density.

    Attributes
    ----------
    arrays, geometry, priors
        What the model was built from.
    model
        The model; its ``…_pull`` data hold the pilot.
    density
        Log density and gradient of the flat vector.
    start
        Where the chains start, dims (coordinate).
    """

    arrays: ElectionArrays
    geometry: Geometry
    priors: Priors
    model: pm.Model
    density: LogDensity
    start: Floats

    def sample(
        self, plan: ChainPlan, *, progress: Callable[[float], None], processes: int | None = None
    ) -> tuple[Parameters, xr.Dataset]:
        """Run the chains; see `sample_chains`.

        Returns
        -------
        Draws of the parameters, sample = chain · draws + draw, and the chains themselves.

        Raises
        ------
        MachineError
            If a sampling process died.
        """
        chains = sample_chains(
            self.density, start=self.start, plan=plan, progress=progress, processes=processes
        )
        return self.read(chains["position"].to_numpy().reshape(-1, self.density.layout.size)), chains

    def read(self, positions: Floats) -> Parameters:
        """Turn flat draws, dims (sample, coordinate), into parameters."""
        return read_parameters(
            positions,
            layout=self.density.layout,
            pulls={name: self.model[name].get_value() for name in PULLS if name in self.model.named_vars},
            arrays=self.arrays,
            geometry=self.geometry,
            priors=self.priors,
        )


def compile_election(
    arrays: ElectionArrays,
    *,
    priors: Priors,
    shared_lean: bool = True,
    like: CompiledElection | None = None,
) -> CompiledElection:
    """Build the model of a contest, compile it, and centre its coordinates on the pilot.

    Parameters
    ----------
    arrays
        The contest and its polls.
    priors
        Prior scales.
    shared_lean
        Whether polls may share an error.
    like
        A compiled election, such as the same contest's on another day. Where both models have the same
        graph its compiled density is used, and its own numbers are lost: it can no longer be sampled.

    Raises
    ------
    ModelInputError
        If the arrays contradict each other.
    """
    geometry = build_geometry(arrays, priors=priors)
    model = build_election_model(arrays, geometry=geometry, priors=priors, shared_lean=shared_lean)
    if like is not None and _same_graph(model, like.model):
        for variable in model.data_vars:
            like.model[variable.name].set_value(variable.get_value(borrow=True))
        density = like.density.laid_out_for(model)
        model = like.model
    else:
        density = compile_log_density(model)
    start = centre_on_pilot(model, density, arrays=arrays, geometry=geometry, priors=priors)
    return CompiledElection(arrays, geometry, priors, model, density, start)


def _same_graph(one: pm.Model, other: pm.Model) -> bool:
    """Tell whether two models differ in their numbers alone: the same variables, data and dims."""

    def parts(model: pm.Model) -> tuple[list[tuple[str, object]], list[str]]:
        variables = [(v.name, v.type) for v in (*model.free_RVs, *model.observed_RVs, *model.data_vars)]
        fixed = [repr(model.coords[name]) for name in ("party", "region", "free_party")]
        return variables, fixed

    return parts(one) == parts(other)
