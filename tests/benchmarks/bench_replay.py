"""Fits per hour of a replay of the demo on one and two workers, and the time in which no chain runs.

The aim: 52 weekly refits of the demo within 20 minutes on two cores. A few of the 52 dates are fitted, spread
evenly, and the rest is reckoned from them. Run with

    pytest tests/benchmarks/bench_replay.py -n 0 -m benchmark -s
"""

from __future__ import annotations

from datetime import date, timedelta
from pathlib import Path
from time import perf_counter

import pandas as pd
import pytest

from aggregator.refits.fit_record import FitRecord
from aggregator.refits.pace import measure_costs
from aggregator.refits.run_tasks import run_tasks
from aggregator.replays.replay_dates import ReplaySpan
from aggregator.replays.replay_plan import plan_replays
from aggregator.settings import RunSettings

DEMO = Path(__file__).parents[2] / "data_demo" / "lake_provinces"
WEEKS, MEASURED = 52, 6
AIM_MINUTES = 20
SPAN = ReplaySpan(first=timedelta(days=1 + 7 * (WEEKS - 1)))


def column(records: list[FitRecord], *, seconds: float, workers: int) -> dict[str, float]:
    """One number of workers."""
    costs = measure_costs(record.facts for record in records)
    return {
        "seconds of the first fit": costs.first_seconds,
        "seconds of the next": costs.next_seconds,
        "fits an hour, compilation left out": 3600 * workers / costs.next_seconds,
        "share of the time without sampling": 1 - costs.sampling_part,
        f"minutes for {len(records)} fits, measured": seconds / 60,
        f"minutes for {WEEKS} fits, reckoned": costs.seconds_for(WEEKS, workers=workers) / 60,
        "hours for 1,000 fits, reckoned": costs.seconds_for(1000, workers=workers) / 3600,
        "fits that passed their checks": sum(bool(r.facts["passed"]) for r in records),
    }


@pytest.mark.benchmark
def test_fits_per_hour_of_the_demo_by_workers(tmp_path: Path) -> None:
    (plan,) = plan_replays((DEMO,), span=SPAN, settings=RunSettings(), today=date.today())
    assert len(plan.tasks) == WEEKS
    chosen = [plan.tasks[round(k * (WEEKS - 1) / (MEASURED - 1))] for k in range(MEASURED)]
    columns = {}
    for workers in (1, 2):
        start = perf_counter()
        records = list(run_tasks(chosen, store=tmp_path / str(workers), workers=workers))
        columns[f"{workers} worker(s)"] = column(records, seconds=perf_counter() - start, workers=workers)
    table = pd.DataFrame(columns)
    table["2 / 1"] = table.iloc[:, 1] / table.iloc[:, 0]
    print(f"\naim: {WEEKS} fits of the demo in {AIM_MINUTES} minutes on two cores")
    print(table.to_string(float_format=lambda x: f"{x:.3g}"))
