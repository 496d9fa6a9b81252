"""Run the chains: the no-U-turn sampler of nutpie, in one process per core, or all in this one."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from multiprocessing.connection import Connection, wait
from typing import Any

import numpy as np
import xarray as xr

from aggregator.errors import MachineError
from aggregator.estimate.cores import can_fork, forked, usable_cores
from aggregator.estimate.log_density import LogDensity
from models.arrays import Floats
from models.dimensions import CHAIN, DRAW

# For a posterior that made the usual steps diverge.
CAREFUL_ACCEPT = 0.9
START_SPREAD = 0.3
PROGRESS_MILLISECONDS = 200


@dataclass(frozen=True)
class ChainPlan:
    """How long to run, and from which seed.

    Attributes
    ----------
    chains, tune, draws
        Number of chains, and of warm-up and kept draws in each.
    seed
        Seed of the whole run: chain c uses the c-th child of it, whatever the number of processes.
    target_accept
        Acceptance that the warm-up steers the step size to.
    """

    chains: int
    tune: int
    draws: int
    seed: int
    target_accept: float = 0.7


def sample_chains(
    density: LogDensity,
    *,
    start: Floats,
    plan: ChainPlan,
    progress: Callable[[float], None],
    processes: int | None = None,
) -> xr.Dataset:
    """Draw from the posterior.

    Parameters
    ----------
    density
        Compiled log density.
    start
        Where every chain starts, up to a jitter of its own, dims (coordinate).
    plan
        Length and seed.
    progress
        Called with the finished part of the work, 0–1.
    processes
        Processes to share the chains; 1 runs them one after the other in this process, None takes one per
        usable core. The draws are the same.

    Returns
    -------
    ``position`` dims (chain, draw, coordinate); ``diverging`` and ``steps`` dims (chain, draw).

    Raises
    ------
    MachineError
        If a process died.
    """
    seeds = [int(s.generate_state(1)[0]) for s in np.random.SeedSequence(plan.seed).spawn(plan.chains)]
    cores = min(plan.chains, processes or usable_cores())
    work = [seeds[i::cores] for i in range(cores)]
    if processes == 1 or not can_fork():
        return _in_order(
            [_chain(density, start=start, plan=plan, seed=s, report=lambda _: None) for s in seeds], seeds
        )
    with forked([partial(_run, density, start, plan, share) for share in work]) as receivers:
        return _in_order(_collect(receivers, total=plan.chains, progress=progress), seeds)


def _run(density: LogDensity, start: Floats, plan: ChainPlan, seeds: list[int], sender: Connection) -> None:
    """Work of one process: its chains one after the other."""
    for seed in seeds:

        def report(part: float, seed: int = seed) -> None:
            sender.send((seed, part, None))

        sender.send((seed, 1.0, _chain(density, start=start, plan=plan, seed=seed, report=report)))
    sender.close()


def _chain(
    density: LogDensity, *, start: Floats, plan: ChainPlan, seed: int, report: Callable[[float], None]
) -> dict[str, Any]:
    import nutpie

    size = density.layout.size

    def initial_point(_: int) -> Floats:
        return start + START_SPREAD * np.random.default_rng(seed).normal(size=size)

    def on_progress(states: list) -> None:
        report(states[0].finished_draws / states[0].total_draws)

    model = nutpie.compiled_pyfunc.from_pyfunc(
        size,
        lambda: density,
        lambda *_: lambda vector: {"position": vector.copy()},
        [np.dtype("float64")],
        [(size,)],
        ["position"],
        make_initial_point_fn=initial_point,
    )
    trace = nutpie.sample(
        model,
        draws=plan.draws,
        tune=plan.tune,
        chains=1,
        cores=1,
        seed=seed,
        target_accept=plan.target_accept,
        progress_bar=False,
        progress_callback=on_progress,
        progress_rate=PROGRESS_MILLISECONDS,
    )
    return {
        "seed": seed,
        "position": trace["posterior"]["position"].values[0],
        "diverging": trace["sample_stats"]["diverging"].values[0],
        "steps": trace["sample_stats"]["n_steps"].values[0],
    }


def _collect(
    pipes: list[Connection], *, total: int, progress: Callable[[float], None]
) -> list[dict[str, Any]]:
    parts: dict[int, float] = {}
    chains: list[dict[str, Any]] = []
    open_pipes = list(pipes)
    while len(chains) < total:
        if not open_pipes:
            raise MachineError(
                f"A sampling process ended early: {len(chains)} of {total} chains arrived. "
                "Free some memory, or run again."
            )
        ready = wait(open_pipes)
        for pipe in [p for p in open_pipes if p in ready]:
            try:
                seed, part, chain = pipe.recv()
            except EOFError:
                open_pipes.remove(pipe)
                continue
            parts[seed] = part
            if chain is not None:
                chains.append(chain)
            progress(sum(parts.values()) / total)
    return chains


def _in_order(chains: list[dict[str, Any]], seeds: list[int]) -> xr.Dataset:
    ordered = sorted(chains, key=lambda chain: seeds.index(chain["seed"]))
    return xr.Dataset(
        {
            "position": ((CHAIN, DRAW, "coordinate"), np.stack([c["position"] for c in ordered])),
            "diverging": ((CHAIN, DRAW), np.stack([c["diverging"] for c in ordered])),
            "steps": ((CHAIN, DRAW), np.stack([c["steps"] for c in ordered])),
        }
    )
