"""Do stated intervals hold as often as they say? Elections drawn from the prior, fitted, and ranked.

Every other test asks about one part; this one asks about all at once, from the priors through sampler and
support to what is published. The seeds were fixed before the first run. A false alarm's chance is at most one
in a thousand in the ordinary tests and one in a hundred in the study, for all quantities together.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from scipy.stats import norm

from aggregator.studies.uniformity import judge_places
from models.arrays import ElectionArrays
from tests.calibration.finished_elections import rank_and_keep
from tests.calibration.ranks import RankedElection, rank_elections
from tests.calibration.uniformity import draw_chart, gather_places, write_chart

FALSE_ALARM, STUDY_FALSE_ALARM = 0.001, 0.01
ELECTIONS = range(1, 21)
CONTROL_ELECTIONS = range(25, 45)
STUDY_ELECTIONS = range(1001, 1201)
IMAGES = Path(__file__).parents[2] / "docs" / "images"
SHARED_LEAN = "shared lean, polling day"


def test_truth_lies_anywhere_among_the_draws_of_elections_drawn_from_the_prior() -> None:
    judged = judge_places(gather_places(list(rank_elections(ELECTIONS))), false_alarm=FALSE_ALARM)
    assert judged["inside"].all(), f"places of the truth are not uniform:\n{judged.round(3).to_string()}"


def test_a_model_told_that_polls_share_a_tenth_of_their_error_is_caught() -> None:
    """Negative control: the elections' shared lean is ten times what the model is told."""
    places = gather_places(list(rank_elections(CONTROL_ELECTIONS, told=_a_tenth_of_the_lean)))
    judged = judge_places(places[[SHARED_LEAN]], false_alarm=FALSE_ALARM)
    assert not judged["inside"].any(), judged.round(3).to_string()


def test_places_of_a_right_posterior_stay_in_the_band_and_those_of_a_narrow_one_do_not() -> None:
    rng = np.random.default_rng(1)
    right = pd.DataFrame({f"right {i}": rng.random(200) for i in range(20)})
    # The places of truths whose sd is 1.5 times the stated one.
    narrow = pd.DataFrame({"narrow": _normal_places(1.5 * rng.normal(size=200))})
    assert judge_places(right, false_alarm=STUDY_FALSE_ALARM)["inside"].all()
    assert not judge_places(narrow, false_alarm=STUDY_FALSE_ALARM)["inside"].any()
    assert judge_places(narrow, false_alarm=STUDY_FALSE_ALARM)["spread"].item() > 1.2


def test_a_study_that_was_stopped_goes_on_where_it_was(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked: list[int] = []

    def rank(seeds: list[int]) -> list[RankedElection]:
        asked.extend(seeds)
        return [RankedElection(seed, {"support": 0.5}, 99.0, 1.0) for seed in seeds]

    monkeypatch.setattr("tests.calibration.finished_elections.rank_elections", rank)
    assert len(list(rank_and_keep(range(3), folder=tmp_path))) == 3
    (kept,) = tmp_path.iterdir()
    # Stopped in the middle of a line.
    kept.write_text(kept.read_text(encoding="utf-8") + '{"seed": 3, "pla', encoding="utf-8")
    again = list(rank_and_keep(range(5), folder=tmp_path))
    assert [election.seed for election in again] == [0, 1, 2, 3, 4]
    assert asked == [0, 1, 2, 3, 4]


@pytest.mark.study
def test_two_hundred_elections_drawn_from_the_prior_are_ranked_evenly(
    pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]
) -> None:
    """Writes the picture and the figures that docs/method.md shows."""
    if pytestconfig.cache is None:
        raise RuntimeError("the study keeps its ranks in pytest's cache: run it without -p no:cacheprovider")
    elections: list[RankedElection] = []
    for election in rank_and_keep(STUDY_ELECTIONS, folder=pytestconfig.cache.mkdir("calibration")):
        elections.append(election)
        if len(elections) % 10 == 0:
            seconds = np.mean([e.seconds for e in elections])
            with capsys.disabled():
                print(f"calibration: {len(elections)} of {len(STUDY_ELECTIONS)}, {seconds:.1f} s a fit")
    places = gather_places(elections)
    judged = judge_places(places, false_alarm=STUDY_FALSE_ALARM)
    write_chart(draw_chart(places, false_alarm=STUDY_FALSE_ALARM), IMAGES / "calibration.svg")
    judged.round(3).to_csv(IMAGES / "calibration.csv", lineterminator="\n")
    with capsys.disabled():
        print(f"\n{judged.round(2).to_string()}")
    assert judged["inside"].all()


def _a_tenth_of_the_lean(arrays: ElectionArrays) -> ElectionArrays:
    return replace(arrays, country=replace(arrays.country, lean_size=arrays.country.lean_size / 10))


def _normal_places(z: np.ndarray) -> np.ndarray:
    return np.asarray(norm.cdf(z))
