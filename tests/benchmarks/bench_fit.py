"""How fast the demo is fitted, against ``pm.sample()`` on the same model in textbook form.

Effective draws per second are the least over what is published: support on polling day by region and
nationally, house leans, design effects, scales. The regional part of the shared lean, which the output step
draws independently each time, is left out on both sides: it would flatter slow chains. Run with

    pytest tests/benchmarks/bench_fit.py -n 0 -m benchmark -s
"""

from __future__ import annotations

import json
import os
import resource
import signal
import subprocess
import sys
import timeit
from datetime import date
from pathlib import Path
from time import perf_counter

import numpy as np
import pandas as pd
import pymc as pm
import pytest
import xarray as xr
from threadpoolctl import threadpool_limits

from aggregator.estimate.compiled_election import PULLS
from aggregator.estimate.fit import release_calendar
from aggregator.estimate.log_density import LogDensity, compile_log_density
from aggregator.estimate.model_arrays import ContestArrays, build_arrays
from aggregator.estimate.parameters import Parameters, read_parameters
from aggregator.estimate.pilot import centre_on_pilot
from aggregator.estimate.poll_fit import pareto_k_by_poll
from aggregator.estimate.sampler_checks import Convergence, check_convergence
from aggregator.estimate.sampling import ChainPlan, sample_chains
from aggregator.estimate.support import summarise_support
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.settings import RunSettings
from models.block_geometry import Geometry, build_geometry
from models.election_model import build_election_model
from models.priors import Priors
from tests.benchmarks.textbook_model import NATURAL, build_textbook_model, natural_parameters

TOP = Path(__file__).parents[2]
DEMO = TOP / "data_demo" / "lake_provinces"
PRIORS = Priors()
PUBLISHED = [
    "support_polling_day",
    "national_support_polling_day",
    "house_lean",
    "design_effect",
    "drift_sd_log",
    "house_sd_log",
    "region_drift_ratio",
]
TEXTBOOK_CHAINS, TEXTBOOK_TUNE, TEXTBOOK_DRAWS = 2, 500, 500
# After this long the reference is stopped and judged by the draws it has.
TEXTBOOK_SECONDS = 480
FEWEST_DRAWS = 50


class Stopwatch:
    """Seconds of each stage, by name."""

    def __init__(self) -> None:
        self.seconds: dict[str, float] = {}
        self._last = perf_counter()

    def lap(self, stage: str) -> None:
        now = perf_counter()
        self.seconds[stage], self._last = now - self._last, now


def cpu_seconds() -> float:
    """Processor time of this process and its ended children: other work on the machine leaves it alone."""
    used = [resource.getrusage(who) for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)]
    return sum(u.ru_utime + u.ru_stime for u in used)


def demo() -> tuple[DeskInputs, ContestArrays, Geometry]:
    inputs = read_contest_folder(DEMO, today=date.today())
    contest = build_arrays(inputs, priors=PRIORS)
    return inputs, contest, build_geometry(contest.arrays, priors=PRIORS)


def published(
    parameters: Parameters, *, inputs: DeskInputs, contest: ContestArrays, chains: int
) -> xr.Dataset:
    """All published quantities, without the regional part of the shared lean."""
    return summarise_support(
        parameters,
        arrays=contest.arrays,
        eras=contest.eras,
        chains=chains,
        calendar=release_calendar(inputs),
        shared_lean=False,
        priors=PRIORS,
        rng=np.random.default_rng(1),
    )


def microseconds_per_evaluation(density: LogDensity, point: np.ndarray) -> float:
    """Fastest of many short runs: other work on the machine only ever adds."""
    return min(timeit.repeat(lambda: density(point), number=20, repeat=100)) / 20 * 1e6


def compile_demo() -> None:
    """Print the seconds of compiling the demo's density, first call included; run in a process of its own."""
    with threadpool_limits(1):
        _, contest, geometry = demo()
        arrays = contest.arrays
        model = build_election_model(arrays, geometry=geometry, priors=PRIORS)
        clock = Stopwatch()
        density = compile_log_density(model)
        density(density.start)
        clock.lap("compile")
    print(json.dumps(clock.seconds))


def compile_seconds(cache: Path) -> float:
    """Compile in a fresh process with its caches in a folder."""
    done = in_process("compile_demo()", environment={"PYTENSOR_FLAGS": f"base_compiledir={cache}"})
    return json.loads(done.splitlines()[-1])["compile"]


def in_process(call: str, *, environment: dict[str, str]) -> str:
    """Call a function of this module in a process of its own; its output."""
    done = subprocess.run(
        [sys.executable, "-W", "ignore", "-c", f"from tests.benchmarks.bench_fit import *; {call}"],
        cwd=TOP,
        env=os.environ | environment,
        stdout=subprocess.PIPE,
        text=True,
        check=True,
    )
    return done.stdout


def sample_textbook(folder: str) -> None:
    """Run the reference and leave its draws in a folder; run in a process of its own."""
    _, contest, _ = demo()
    arrays = contest.arrays
    signal.signal(signal.SIGALRM, signal.default_int_handler)
    signal.alarm(TEXTBOOK_SECONDS)
    start, processor = perf_counter(), cpu_seconds()
    trace = pm.sample(
        draws=TEXTBOOK_DRAWS,
        tune=TEXTBOOK_TUNE,
        chains=TEXTBOOK_CHAINS,
        cores=TEXTBOOK_CHAINS,
        random_seed=1,
        progressbar=False,
        model=build_textbook_model(arrays, priors=PRIORS),
    )
    seconds, processor = perf_counter() - start, cpu_seconds() - processor
    signal.alarm(0)
    # A stopped chain may be shorter than the other.
    draws = trace["posterior"].to_dataset()[list(NATURAL)].dropna("draw")
    draws.to_netcdf(Path(folder) / "draws.nc", engine="h5netcdf")
    stats = trace["sample_stats"].to_dataset().isel(draw=slice(draws.sizes["draw"]))
    facts = {
        "draws": draws.sizes["draw"],
        "seconds, all": seconds,
        "processor seconds, all": processor,
        "seconds, sampling": trace["posterior"].attrs.get("sampling_time", np.nan),
        "steps per draw": float(stats["n_steps"].mean()),
        "divergences": int(stats["diverging"].sum()),
        "dimensions": sum(
            int(np.prod(variable.shape[2:]))
            for name, variable in trace["posterior"].data_vars.items()
            if name not in NATURAL
        ),
    }
    (Path(folder) / "facts.json").write_text(json.dumps(facts))


def fit_demo() -> tuple[dict[str, float], dict[str, float], Convergence]:
    """Seconds by stage, facts and diagnostics of our own fit."""
    settings = RunSettings()
    clock = Stopwatch()
    with threadpool_limits(1):
        inputs, contest, geometry = demo()
        arrays = contest.arrays
        clock.lap("read and arrange")
        processor = cpu_seconds()
        model = build_election_model(arrays, geometry=geometry, priors=PRIORS)
        clock.lap("build")
        density = compile_log_density(model)
        density(density.start)
        clock.lap("compile, caches as found")
        start = centre_on_pilot(model, density, arrays=arrays, geometry=geometry, priors=PRIORS)
        clock.lap("pilot")
        chains = sample_chains(
            density,
            start=start,
            plan=ChainPlan(chains=settings.chains, tune=settings.tune, draws=settings.draws, seed=1),
            progress=lambda _: None,
        )
        clock.lap("sampling")
        processor = cpu_seconds() - processor
        parameters = read_parameters(
            chains["position"].to_numpy().reshape(-1, density.layout.size),
            layout=density.layout,
            pulls={name: model[name].get_value() for name in PULLS if name in model.named_vars},
            arrays=arrays,
            geometry=geometry,
            priors=PRIORS,
        )
        draws = published(parameters, inputs=inputs, contest=contest, chains=settings.chains)
        clock.lap("summary")
        check_convergence(draws.drop_vars(["kappa", "rho"]), divergences=0)
        clock.lap("checks")
        pareto_k_by_poll(parameters, arrays=arrays, chains=settings.chains)
        clock.lap("fit of each poll")
        found = check_convergence(draws[PUBLISHED], divergences=int(chains["diverging"].sum()))
        facts = {
            "dimensions": density.layout.size,
            "seconds, sampling": clock.seconds["sampling"],
            "seconds, all": sum(clock.seconds[s] for s in STAGES_TO_DRAWS),
            "processor seconds, all": processor,
            "steps per draw": float(chains["steps"].mean()),
            "microseconds per evaluation": microseconds_per_evaluation(density, start),
        }
    return clock.seconds, facts, found


STAGES_TO_DRAWS = ("build", "compile, caches as found", "pilot", "sampling")


def column(facts: dict[str, float], found: Convergence) -> dict[str, float]:
    """One side of the comparison."""
    bulk, tail = found.least_bulk[1], found.least_tail[1]
    return {
        "dimensions": facts["dimensions"],
        "seconds, all": facts["seconds, all"],
        "seconds, sampling": facts["seconds, sampling"],
        "processor seconds, all": facts["processor seconds, all"],
        "steps per draw": facts["steps per draw"],
        "divergences": found.divergences,
        "largest R-hat": found.worst_rhat[1],
        "least bulk ESS": bulk,
        "least tail ESS": tail,
        "bulk ESS per second, all": bulk / facts["seconds, all"],
        "tail ESS per second, all": tail / facts["seconds, all"],
        "bulk ESS per second, sampling": bulk / facts["seconds, sampling"],
        "tail ESS per second, sampling": tail / facts["seconds, sampling"],
        "bulk ESS per processor second": bulk / facts["processor seconds, all"],
        "tail ESS per processor second": tail / facts["processor seconds, all"],
    }


@pytest.mark.benchmark
def test_seconds_of_the_fit_by_stage_and_effective_draws_per_second(tmp_path: Path) -> None:
    cold, warm = compile_seconds(tmp_path), compile_seconds(tmp_path)
    stages, facts, found = fit_demo()
    print(
        f"\nseconds by stage, {RunSettings().chains} x ({RunSettings().tune} + {RunSettings().draws}) draws"
    )
    rows = {"compile, cold": cold, "compile, warm": warm} | stages
    print(pd.Series(rows).to_string(float_format=lambda x: f"{x:.2f}"))
    print(f"{facts['microseconds per evaluation']:.0f} microseconds per evaluation of density and gradient")

    in_process(f"sample_textbook({str(tmp_path)!r})", environment={})
    inputs, contest, _ = demo()
    reference = json.loads((tmp_path / "facts.json").read_text())
    print(
        f"pm.sample() on the textbook model: {TEXTBOOK_CHAINS} x ({TEXTBOOK_TUNE} + {TEXTBOOK_DRAWS}) draws, "
        f"{reference['draws']} of them within {TEXTBOOK_SECONDS} s"
    )
    if reference["draws"] < FEWEST_DRAWS:
        print(pd.Series(column(facts, found)).to_string(float_format=lambda x: f"{x:.4g}"))
        return
    parameters = natural_parameters(xr.load_dataset(tmp_path / "draws.nc", engine="h5netcdf"))
    draws = published(parameters, inputs=inputs, contest=contest, chains=TEXTBOOK_CHAINS)
    reference_found = check_convergence(draws[PUBLISHED], divergences=reference["divergences"])
    table = pd.DataFrame({"ours": column(facts, found), "pm.sample()": column(reference, reference_found)})
    table["ours / pm.sample()"] = table["ours"] / table["pm.sample()"]
    print(table.to_string(float_format=lambda x: f"{x:.4g}"))
