from __future__ import annotations

import pytest

from aggregator.refits.pace import measure_costs, words_for


def facts(seconds: float, *, build: float, sampling: float, reused: bool) -> dict[str, object]:
    return {
        "reused_compilation": reused,
        "seconds": {"build": build, "sampling": sampling, "all": seconds},
    }


def test_a_thousand_fits_are_forecast_from_measured_ones():
    costs = measure_costs(
        [
            facts(50, build=30, sampling=16, reused=False),
            facts(18, build=1, sampling=14, reused=True),
            facts(22, build=1, sampling=18, reused=True),
        ]
    )
    assert (costs.fits, costs.first_seconds, costs.next_seconds) == (3, 50, 20)
    assert costs.sampling_part == pytest.approx(48 / 90)
    assert costs.seconds_for(1000, workers=1) == 50 + 999 * 20
    assert costs.seconds_for(1000, workers=16) == 50 + 62 * 20


def test_a_first_fit_is_not_taken_for_the_next():
    costs = measure_costs([facts(50, build=30, sampling=16, reused=False)])
    assert (costs.first_seconds, costs.next_seconds) == (50, 20)


def test_no_fit_costs_nothing_that_could_be_told():
    with pytest.raises(ValueError, match="no fit"):
        measure_costs([])


@pytest.mark.parametrize(
    ("seconds", "words"),
    [(0.2, "1 s"), (75, "75 s"), (90, "2 min"), (3540, "59 min"), (3600, "1 h"), (9900, "2 h 45 min"),
     (86_400, "24 h")],
)  # fmt: skip
def test_durations_are_said_as_people_do(seconds, words):
    assert words_for(seconds) == words
