"""What the program says of a register and a fit, counted, and set beside the honest elections."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pandas as pd
import pytest

from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem
from aggregator.studies.beside_honest import summarise_alarms
from aggregator.studies.invented_elections import draw_invented_election
from aggregator.studies.judged_elections import JudgedElections
from aggregator.studies.noticed import list_noticed, summarise_noticed
from data_demo.made_up_election import SMALL_ELECTION
from tests.studies.made_up_fits import made_up_pair

TINY = replace(SMALL_ELECTION, parties=3, regions=2, seats=6, polls=25, weeks=26, polled_weeks=24, houses=4)


def doubt(rule: Rule) -> Problem:
    return Problem("polls.csv", 4, "P1", "97", "100", "Look again.", rule)


@pytest.fixture(scope="module")
def inputs() -> Any:
    return draw_invented_election(4, size=TINY).inputs


def test_warnings_screens_figures_and_checks_are_counted(
    inputs: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    screens = pd.DataFrame({"screen": ["spread", "spread", "timing"]})
    monkeypatch.setattr("aggregator.studies.noticed.screen_polls", lambda *_, **__: screens)
    warned = replace(inputs, warnings=(doubt(Rule.WINDOWS_OVERLAP), doubt(Rule.WINDOWS_OVERLAP)))
    election, fit = made_up_pair(1, inputs=warned)
    fit = replace(fit, facts={**fit.facts, "passed": False, "stands_out": ["", "House A", "House B"]})
    noticed = list_noticed(election, fit, rng=np.random.default_rng(0))
    counts = {(row["kind"], row["name"]): row["count"] for row in noticed.to_dict("records")}
    assert counts == {
        ("warning", f"{Rule.WINDOWS_OVERLAP} windows overlap"): 2,
        ("screen", "spread"): 2,
        ("screen", "timing"): 1,
        ("predictive", "a house stands out"): 2,
        ("predictive", "all houses together stand out"): 1,
        ("check", "of the fit failed"): 1,
    }


def test_elections_are_counted_once_whatever_was_said_how_often() -> None:
    noticed = pd.DataFrame(
        [(1, "screen", "spread", 3), (2, "screen", "spread", 1), (2, "screen", "timing", 1)],
        columns=["election", "kind", "name", "count"],
    )
    table = summarise_noticed(noticed, elections=4).set_index("name")
    assert table["elections"].to_dict() == {"spread": 50.0, "timing": 25.0}
    assert table["mean_count"].to_dict() == {"spread": 1.0, "timing": 0.25}


def test_what_is_said_more_often_because_of_a_violation_comes_first() -> None:
    def study(*said: tuple[int, str]) -> JudgedElections:
        rows = [(election, "screen", name, 1) for election, name in said]
        noticed = pd.DataFrame(rows, columns=["election", "kind", "name", "count"])
        nothing = pd.DataFrame()
        return JudgedElections(nothing, (), nothing, noticed, pd.DataFrame({"election": range(4)}), ())

    honest = study((0, "timing"), (1, "timing"), (2, "spread"))
    violated = study((0, "spread"), (1, "spread"), (2, "spread"), (3, "repeated_figures"))
    alarms = summarise_alarms(violated, honest)
    assert alarms["name"].tolist() == ["spread", "repeated_figures", "timing"]
    assert alarms["honest"].tolist() == [25.0, 0.0, 50.0]
    assert alarms["violated"].tolist() == [75.0, 25.0, 0.0]
