"""How fast a release is written, against one sort of the same draws.

4,000 draws, 80 dates, 3 regions, 5 parties and an alliance. Run with

    pytest tests/benchmarks/bench_release.py -n 0 -m benchmark -s
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from time import perf_counter

import numpy as np
import pytest

from aggregator.release.chart_files import write_charts
from aggregator.release.charts import build_charts, chart_frame
from aggregator.release.draw_summaries import stack_samples, summarise_samples
from aggregator.release.write_release import build_contents, write_release
from tests.release.made_up_desk import made_up_run


def seconds(work: Callable[[], object], *, runs: int = 3) -> float:
    """Seconds of the fastest run."""
    times = []
    for _ in range(runs):
        start = perf_counter()
        work()
        times.append(perf_counter() - start)
    return min(times)


@pytest.mark.benchmark
def test_speed_of_a_release(tmp_path: Path) -> None:
    run = made_up_run(tmp_path, chains=4, draws=1000, dates=80, polls=250)
    inputs = run.pop("inputs")
    samples = stack_samples(run["draws"]["support"], dims=("date", "region", "party"))
    reference = seconds(lambda: np.sort(samples, axis=-1))
    contents = build_contents(inputs, **run)
    steps = {
        "quantiles, means and sds of support": lambda: summarise_samples(samples),
        "all tables": lambda: build_contents(inputs, **run),
        "all charts, wide and narrow, SVG, PNG and JSON": lambda: write_charts(
            tmp_path / "charts", charts=build_charts(contents), frame=chart_frame(contents)
        ),
        "the whole release": lambda: write_release(inputs, **run),
    }
    print(f"\none sort of {samples.size:,} draws of support: {reference:.2f} s, the reference")
    for name, work in steps.items():
        took = seconds(work, runs=2)
        print(f"{name:50s} {took:6.2f} s  {took / reference:6.1f} x")
    assert np.isfinite(samples).all()
