"""What a fit costs as a contest grows: polls, regions, weeks and parties, one at a time; and a whole refresh.

Every case runs in a process of its own, and is told as a ratio to the base case of the same run. Run all, or
one by its name:

    pytest tests/benchmarks/bench_cost.py -n 0 -m benchmark -s
    pytest tests/benchmarks/bench_cost.py -n 0 -m benchmark -s -k "base or polls_800"
    pytest tests/benchmarks/bench_cost.py -n 0 -m benchmark -s -k contest

``numba, new`` counts functions that were compiled because no cache held them: above zero, ``compile`` is not
that of a desk's next week. Run such a case again.
"""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from datetime import date
from pathlib import Path
from time import perf_counter, sleep
from typing import Any
from unittest.mock import patch

import numba.core.event
import pandas as pd
import pytest

from data_demo.made_up_election import ElectionSize, simulate_election
from data_demo.made_up_folder import write_contest_folder
from tests.benchmarks.bench_refresh import memory_in_use

TOP = Path(__file__).parents[2]
AFTER_THE_ELECTION = date(2100, 1, 1)
SEED = 1
SECONDS_BETWEEN_LOOKS = 0.5

BASE = ElectionSize(
    parties=7,
    regions=12,
    seats=240,
    houses=12,
    polls=200,
    weeks=104,
    polled_weeks=103,
    regional_party=False,
    new_party=False,
    dissolved_party=False,
    alliances=False,
)
AXES: dict[str, tuple[int, ...]] = {
    "polls": (100, 400, 800),
    "regions": (4, 36),
    "weeks": (26, 208),
    "parties": (3, 12),
}
CASES = {"base": BASE} | {
    f"{axis}_{value}": replace(
        BASE, **{axis: value}, **({"polled_weeks": value - 1} if axis == "weeks" else {})
    )
    for axis, values in AXES.items()
    for value in values
}
# Everything the base leaves out is in: a regional and a new party, an alliance, a dissolved party.
CONTEST = ElectionSize(parties=7, regions=12, seats=600, houses=12, polls=400, weeks=104, polled_weeks=103)
# A short run of the script itself, for whoever changes it.
TRIAL = replace(BASE, parties=3, regions=2, seats=20, houses=3, polls=20, weeks=20, polled_weeks=18)


@contextmanager
def watched_calls(places: dict[str, str], facts: dict[str, Any]) -> Iterator[None]:
    """Time functions wherever they are called, and keep the last arguments and result of each.

    Parameters
    ----------
    places
        Dotted place of each function, by the name its facts get.
    facts
        Filled with ``(seconds, keyword arguments, result)`` by that name; seconds of repeated calls add up.
    """
    patches = [patch(place, _watched(place, name, facts)) for name, place in places.items()]
    for one in patches:
        one.start()
    try:
        yield
    finally:
        for one in patches:
            one.stop()


def _watched(place: str, name: str, facts: dict[str, Any]) -> Callable[..., Any]:
    module, _, function = place.rpartition(".")
    __import__(module)
    work = getattr(sys.modules[module], function)

    def timed(*arguments: Any, **options: Any) -> Any:
        start = perf_counter()
        result = work(*arguments, **options)
        if name == "compile":
            # The first call is part of it: numba compiles what it has left open.
            result(result.start)
        before = facts[name][0] if name in facts else 0.0
        facts[name] = before + perf_counter() - start, options, result
        return result

    return timed


def newly_compiled(recorder: numba.core.event.RecordingListener) -> int:
    """Count what numba compiled since no cache held it; addresses are looked up anew each time."""
    names = [event.data["dispatcher"].py_func.__name__ for _, event in recorder.buffer if event.is_end]
    return sum(name not in ("get_gemm_pointer", "get_gemv_pointer", "get_ptr_func") for name in names)


def fit_case(folder: str) -> None:
    """Fit the contest of a folder and print its costs as JSON; run in a process of its own."""
    from aggregator.estimate.fit import fit_contest
    from aggregator.inputs.contest_folder import read_contest_folder
    from aggregator.settings import RunSettings
    from tests.benchmarks.bench_fit import microseconds_per_evaluation

    inputs = read_contest_folder(Path(folder), today=AFTER_THE_ELECTION)
    calls: dict[str, Any] = {}
    places = {
        "compile": "aggregator.estimate.compiled_election.compile_log_density",
        "pilot": "aggregator.estimate.compiled_election.centre_on_pilot",
        "sampling": "aggregator.estimate.compiled_election.sample_chains",
    }
    with numba.core.event.install_recorder("numba:compile") as compiled, watched_calls(places, calls):
        start = perf_counter()
        fit = fit_contest(inputs, settings=RunSettings(), second_attempts=False)
        seconds = perf_counter() - start
    density, chains = calls["compile"][2], calls["sampling"][2]
    costs = {
        "rows": len(inputs.polls),
        "dimensions": density.layout.size,
        **{f"{name}, s": calls[name][0] for name in places},
        "fit, s": seconds,
        "us per evaluation": microseconds_per_evaluation(density, calls["sampling"][1]["start"]),
        "steps per draw": float(chains["steps"].mean()),
        "divergences": fit.convergence.divergences,
        "worst R-hat": fit.convergence.worst_rhat[1],
        "least tail ESS": fit.convergence.least_tail[1],
        "numba, new": newly_compiled(compiled),
    }
    print(json.dumps(costs))


def refresh_case(folder: str, out: str) -> None:
    """Refresh the contest of a folder and print its seconds by stage; run in a process of its own."""
    from aggregator.weekly_run import refresh

    began: dict[str, float] = {}

    def progress(stage: str, _part: float) -> None:
        began.setdefault(stage, perf_counter())

    with numba.core.event.install_recorder("numba:compile") as compiled:
        outcome = refresh(Path(folder), out=Path(out), today=AFTER_THE_ELECTION, progress=progress)
    began["end"] = perf_counter()
    times = list(began.values())
    stages = {f"{name}, s": b - a for name, a, b in zip(began, times, times[1:], strict=False)}
    print(
        json.dumps(
            {
                **stages,
                "checks passed": outcome.passed,
                "numba, new": newly_compiled(compiled),
            }
        )
    )


def in_process(call: str) -> dict[str, Any]:
    """Call a function of this module in a process of its own; its costs, seconds in all and peak memory."""
    command = [sys.executable, "-W", "ignore", "-c", f"from tests.benchmarks.bench_cost import *; {call}"]
    start = perf_counter()
    process = subprocess.Popen(command, cwd=TOP, stdout=subprocess.PIPE, text=True)
    peak = 0.0
    while process.poll() is None:
        peak = max(peak, memory_in_use(process.pid))
        sleep(SECONDS_BETWEEN_LOOKS)
    output, _ = process.communicate()
    seconds = perf_counter() - start
    if process.returncode:
        raise RuntimeError(f"{call} ended with {process.returncode}: {output}")
    return json.loads(output.splitlines()[-1]) | {"whole process, s": seconds, "peak GiB": peak}


def made_up_folder(folder: Path, *, size: ElectionSize) -> Path:
    """Write a contest folder of a size."""
    write_contest_folder(simulate_election(SEED, size=size), folder)
    return folder


def told(costs: pd.DataFrame) -> str:
    return costs.to_string(float_format=lambda x: f"{x:.4g}")


@pytest.fixture(scope="module")
def table() -> Iterator[dict[str, dict[str, Any]]]:
    """Costs by case, told as one table and as ratios to the base when all cases have run."""
    costs: dict[str, dict[str, Any]] = {}
    yield costs
    if len(costs) > 1:
        whole = pd.DataFrame(costs)
        print(f"\n\n{told(whole)}")
        if "base" in costs:
            ratios = whole.astype(float).div(whole["base"].astype(float), axis=0)
            print(f"\nas ratios to the base\n{told(ratios)}")


@pytest.mark.benchmark
@pytest.mark.parametrize("case", CASES)
def test_cost_of_a_fit(case: str, tmp_path: Path, table: dict[str, dict[str, Any]]) -> None:
    folder = made_up_folder(tmp_path / "contest", size=CASES[case])
    table[case] = in_process(f"fit_case({str(folder)!r})")
    print(f"\n{told(pd.DataFrame({case: table[case]}))}")


@pytest.mark.benchmark
def test_cost_of_refreshing_a_large_contest(tmp_path: Path) -> None:
    folder = made_up_folder(tmp_path / "contest", size=CONTEST)
    # The first run warms the caches; the next is the desk's next week.
    runs = {
        name: in_process(f"refresh_case({str(folder)!r}, {str(tmp_path / name)!r})")
        for name in ("first", "warm")
    }
    print(f"\n{CONTEST}\n{told(pd.DataFrame(runs))}")


def test_the_cost_of_a_case_can_be_measured_and_told() -> None:
    """Keep the script in step with the doors it measures, without a fit."""
    assert set(CASES) >= {"base", "polls_800", "regions_36", "weeks_208", "parties_12"}
    assert CASES["weeks_26"].polled_weeks == 25
    facts: dict[str, Any] = {}
    with watched_calls({"sum": "tests.benchmarks.bench_cost.memory_in_use"}, facts):
        memory_in_use(0)
    assert facts["sum"][2] == 0.0
