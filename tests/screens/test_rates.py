"""How often the screens ask: of honest registers, and of registers whose figures were pulled together.

The rates of ``docs/screens.md``. Run with

    pytest tests/screens/test_rates.py -n 0 -m study -s
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Sequence

import numpy as np
import pandas as pd
import pytest
from scipy.stats import binom

from aggregator.screens.habits import ask_about_sample_sizes, ask_about_timing
from aggregator.screens.questions import LEVEL
from aggregator.screens.register_series import poll_table
from aggregator.screens.repeated_figures import ask_about_repeated_figures
from aggregator.screens.spread import ask_about_spread
from tests.screens.made_up_registers import (
    CODES,
    REGIONS,
    pulled_together,
    simulated_inputs,
    tidy_register,
)

type Register = tuple[pd.DataFrame, Sequence[str], Sequence[str]]


def tidy(seed: int) -> Register:
    return tidy_register(seed), CODES, REGIONS


def simulated(seed: int) -> Register:
    inputs = simulated_inputs(seed)
    codes = [code for code in inputs.contest.column_codes if inputs.polls[code].notna().any()]
    return inputs.polls, codes, inputs.contest.region_codes


def rates(registers: Iterable[Register]) -> Counter[str]:
    """Count registers in which each thing happens, and houses asked where all were pulled together."""
    counts: Counter[str] = Counter()
    for polls, codes, regions in registers:

        def asked(
            rows: pd.DataFrame, codes: Sequence[str] = codes, regions: Sequence[str] = regions
        ) -> set[str]:
            rng = np.random.default_rng(1)
            return {q.house for q in ask_about_spread(rows, codes=codes, regions=regions, rng=rng)}

        busy = polls["house"].value_counts().index
        middle = str(busy[len(busy) // 2])
        table = poll_table(polls, regions=regions)
        one = asked(pulled_together(polls, houses={middle}, codes=tuple(codes)))
        everyone = asked(pulled_together(polls, houses=set(busy), codes=tuple(codes)))
        counts += Counter(
            {
                "registers": 1,
                "honest: spread": bool(asked(polls)),
                "honest: repeated figures": bool(ask_about_repeated_figures(polls, codes=codes)),
                "honest: sample size": bool(ask_about_sample_sizes(table)),
                "honest: timing": bool(ask_about_timing(table)),
                "one house pulled: that house": middle in one,
                "one house pulled: another house": bool(one - {middle, ""}),
                "all pulled: the field": "" in everyone,
                "all pulled: any": bool(everyone),
                "all pulled: houses asked": len(everyone - {""}),
                "houses": len(busy),
            }
        )
    return counts


@pytest.mark.study
@pytest.mark.parametrize(("kind", "runs"), [(tidy, 300), (simulated, 50)])
def test_honest_registers_rarely_raise_a_question(kind: Callable[[int], Register], runs: int) -> None:
    found = rates(kind(seed) for seed in range(runs))
    print(f"\n{kind.__name__}\n{pd.Series(found).to_string()}")
    most = binom.ppf(0.999, runs, LEVEL)
    assert all(count <= most for name, count in found.items() if name.startswith("honest"))


def test_rates_of_a_few_registers_can_be_counted() -> None:
    """Keep the study in step with the screens."""
    found = rates([tidy(1)])
    assert found["registers"] == found["one house pulled: that house"] == found["all pulled: the field"] == 1
