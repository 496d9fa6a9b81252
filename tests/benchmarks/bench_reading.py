"""How fast a contest folder is read, against pandas reading the same two tables unchecked.

400 polls of 12 houses and 600 seats. Run with

    pytest tests/benchmarks/bench_reading.py -n 0 -m benchmark -s
"""

from __future__ import annotations

from datetime import date, timedelta
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from aggregator.inputs.contest_folder import read_contest_folder
from tests.benchmarks.bench_counting import fastest

POLLS, HOUSES, SEATS = 400, 12, 600
CODES = ("HU", "UP", "CC", "TL", "OL", "OTH")
REGIONS = ("NORTH", "HARB", "MERE", "ISLE")


def write_large_contest(folder: Path) -> None:
    """A contest of the size of a large national one."""
    rng = np.random.default_rng(1)
    parts = ['title = "Assembly"\npolling_day = 2031-05-18\n']
    parts += [f'[[party]]\ncode = "{c}"\nname = "Party {c}"\n' for c in CODES[:-1]]
    parts += [f'[[region]]\ncode = "{r}"\nname = "Region {r}"\n' for r in REGIONS]
    parts.append("[last_result]\ndate = 2027-05-16\n")
    (folder / "contest.toml").write_text("".join(parts))
    share = np.array([0.33, 0.3, 0.14, 0.1, 0.07, 0.06])
    lines = ["poll,house,start,end,published,sample,mode," + ",".join(CODES)]
    for i in range(POLLS):
        end = date(2031, 4, 20) - timedelta(days=3 * i)
        answers = rng.multinomial(1000, share) / 10
        shown = ",".join(f"{a:.1f}" for a in answers)
        lines.append(
            f"P-{i},House {'ABCDEFGHIJKL'[i % HOUSES] * 3},{end - timedelta(days=2)},{end},{end},"
            f"{rng.integers(800, 2400)},online,{shown}"
        )
    (folder / "polls.csv").write_text("\n".join(lines) + "\n")
    votes = rng.multinomial(20_000, share, size=SEATS)
    lines = ["seat,region," + ",".join(CODES)]
    lines += [f"S{i},{REGIONS[i % 4]}," + ",".join(map(str, v)) for i, v in enumerate(votes)]
    (folder / "result_last.csv").write_text("\n".join(lines) + "\n")


@pytest.mark.benchmark
def test_reading_a_large_contest(tmp_path):
    write_large_contest(tmp_path)
    unchecked, _ = fastest(
        lambda: [
            pd.read_csv(tmp_path / "polls.csv", parse_dates=["start", "end", "published"]),
            pd.read_csv(tmp_path / "result_last.csv"),
        ]
    )
    checked, inputs = fastest(lambda: read_contest_folder(tmp_path, today=date(2031, 5, 1)))
    assert (len(inputs.polls), len(inputs.last_result)) == (POLLS, SEATS)
    print(f"\nread and checked {checked * 1000:.0f} ms, {checked / unchecked:.1f} times pandas unchecked")
