"""What a reader of a replay must be told."""

from __future__ import annotations

from aggregator.release.cautions import CAUTIONS, Caution

REPLAY_CAUTIONS = (
    Caution(
        "One election is one draw.",
        "However many dates are replayed, there is one result. Dates next to each other are almost the same "
        "forecast, and parties share one another's gains: neither makes more evidence.",
    ),
    Caution(
        "The polls of one election err together.",
        "What all houses got wrong is in every poll, in this model's estimate and in every rival's. A "
        "replay of one election shows that error once, and cannot tell a good method from a lucky year.",
    ),
    Caution(
        "Past accuracy is no promise.",
        "Parties, houses and ways of asking change. Intervals that held last time need not hold the next.",
    ),
    Caution(
        "Known then, chosen now.",
        "Each date saw only what had been published by then. The method itself, and what was entered into "
        "the register, were settled later, by people who may have known the result.",
    ),
    Caution(
        "A document for the desk.",
        "The report judges methods and single polls with the benefit of hindsight. It is not written for "
        "publication; a sentence taken from it needs the number of elections behind it, and its interval.",
    ),
    CAUTIONS[-1],
)

CHART_CAUTION = (
    "One election is one draw: dates next to each other are almost the same forecast. "
    "Past accuracy is no promise."
)
"""The caution inside every chart of a replay."""
