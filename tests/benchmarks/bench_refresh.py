"""Seconds and memory of a whole refresh of the demo, against the aim and against starting Python alone.

The aim: 40 seconds and 2 GiB on two cores, caches warm. Run with

    pytest tests/benchmarks/bench_refresh.py -n 0 -m benchmark -s
"""

from __future__ import annotations

import json
import subprocess
import sys
from datetime import date
from pathlib import Path
from time import perf_counter, sleep

import pandas as pd
import pytest

from tests.benchmarks.bench_counting import fastest

TOP = Path(__file__).parents[2]
DEMO = TOP / "data_demo" / "lake_provinces"
AIM_SECONDS, AIM_GIB = 40, 2
# A look at the memory of two large processes takes a tenth of a second.
SECONDS_BETWEEN_LOOKS = 1.0
REFRESH = "from tests.benchmarks.bench_refresh import *; refresh_demo({out!r})"


def refresh_demo(out: str) -> None:
    """Refresh the demo and print when each stage began, in seconds of this process's clock."""
    from aggregator.weekly_run import refresh

    began: dict[str, float] = {"stages": perf_counter()}

    def progress(stage: str, _part: float) -> None:
        began.setdefault(stage, perf_counter())

    refresh(DEMO, out=Path(out), today=date.today(), progress=progress)
    began["end"] = perf_counter()
    print(json.dumps(began))


def run_refresh(out: Path, *, watch_memory: bool) -> tuple[float, float, dict[str, float]]:
    """Seconds from start to finished release, peak memory in GiB if watched, seconds by stage."""
    start = perf_counter()
    command = [sys.executable, "-W", "ignore", "-c", REFRESH.format(out=str(out))]
    process = subprocess.Popen(command, cwd=TOP, stdout=subprocess.PIPE, text=True)
    peak = 0.0
    while watch_memory and process.poll() is None:
        peak = max(peak, memory_in_use(process.pid))
        sleep(SECONDS_BETWEEN_LOOKS)
    output, _ = process.communicate()
    seconds = perf_counter() - start
    if process.returncode:
        raise RuntimeError(f"the refresh ended with {process.returncode}: {output}")
    began = json.loads(output.splitlines()[-1])
    times = list(began.values())
    lengths = {name: after - at for name, at, after in zip(began, times, times[1:], strict=False)}
    lengths.pop("stages")
    return seconds, peak, {"start and imports": seconds - sum(lengths.values()), **lengths}


def memory_in_use(process: int) -> float:
    """GiB of a process and its children, shared pages counted once; Linux only, zero elsewhere."""
    total, family = 0, [process]
    while family:
        member = Path("/proc") / str(family.pop())
        try:
            text = (member / "smaps_rollup").read_text()
            total += next(int(line.split()[1]) for line in text.splitlines() if line.startswith("Pss:"))
            for thread in (member / "task").iterdir():
                family += [int(child) for child in (thread / "children").read_text().split()]
        except (OSError, StopIteration):
            continue
    return total / 2**20


def seconds_of(code: str) -> float:
    """Fastest start of Python with some code."""
    return fastest(lambda: subprocess.run([sys.executable, "-c", code], cwd=TOP, check=True))[0]


@pytest.mark.benchmark
def test_seconds_and_memory_of_a_refresh(tmp_path: Path) -> None:
    bare, imports = seconds_of("pass"), seconds_of("import aggregator.weekly_run")
    # The first run warms the caches and is watched; watching slows it, so the second is timed.
    _, peak, _ = run_refresh(tmp_path / "watched", watch_memory=True)
    seconds, _, stages = run_refresh(tmp_path / "timed", watch_memory=False)
    print(f"\nstarting Python {bare:.2f} s, with the imports of a refresh {imports:.2f} s")
    print(pd.Series(stages, name="seconds").to_string(float_format=lambda x: f"{x:.2f}"))
    print(
        f"a refresh: {seconds:.1f} s, {seconds / AIM_SECONDS:.2f} of the aim of {AIM_SECONDS} s and "
        f"{seconds / imports:.1f} times the imports"
    )
    print(f"peak memory {peak:.2f} GiB, {peak / AIM_GIB:.2f} of the aim of {AIM_GIB} GiB")
