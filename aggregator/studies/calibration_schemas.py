"""What the tables of a calibration hold, column by column."""

from __future__ import annotations

from aggregator.release.table_columns import (
    ANY_COUNT,
    ANY_NUMBER,
    CODE,
    PERCENT,
    PROBABILITY,
    Bounds,
    Column,
    ColumnType,
    TableSchema,
    number_column,
    whole_column,
    yes_no_column,
)
from aggregator.replays.distribution_scores import INTERVALS
from aggregator.studies.invented_elections import Quantity

_UNIT = "percent, or seats"
_POINTS = "points, or seats"
_ONE_ELECTION = "a single election"


def _text(name: str, meaning: str) -> Column:
    return Column(name, ColumnType.TEXT, "–", meaning)


ELECTION = whole_column("election", "–", "Seed of the election")
GROUP = _text("group", "Numbers taken together; parties are grouped by their estimate")
ELECTIONS = whole_column("elections", "–", "Number of elections")
KIND = _text("kind", "Kind of number")


def _number(
    name: str,
    unit: str,
    meaning: str,
    *,
    decimals: int = 2,
    bounds: Bounds = ANY_NUMBER,
    blank: str | None = None,
) -> Column:
    return number_column(name, unit, meaning, decimals=decimals, bounds=bounds, blank=blank)


def _interval(unit: str, of: str, *, bounds: Bounds, decimals: int = 2) -> tuple[Column, Column]:
    return (
        _number(
            "low",
            unit,
            f"Lower end of the 95 % bootstrap interval of {of}, elections drawn again",
            bounds=bounds,
            decimals=decimals,
            blank=_ONE_ELECTION,
        ),
        _number(
            "high", unit, "Upper end of that interval", bounds=bounds, decimals=decimals, blank=_ONE_ELECTION
        ),
    )


NUMBERS = TableSchema(
    "tables/numbers.csv",
    "election, quantity, region and code",
    (
        ELECTION,
        Column("quantity", ColumnType.TEXT, "–", "What is estimated", allowed=tuple(Quantity)),
        Column("region", ColumnType.CODE, "–", "Region code", blank="the whole country"),
        CODE,
        _number("estimate", _UNIT, "Mean of the draws"),
        _number("truth", _UNIT, "What was true"),
        _number("crps", _POINTS, "Continuous ranked probability score, smaller is better", decimals=3),
        _number(
            "place",
            "0 to 1",
            "Place of the truth among the draws; drawn at random within a whole number's own step",
            decimals=4,
            bounds=PROBABILITY,
        ),
        *(
            Column(
                f"inside_{percent}",
                ColumnType.WHOLE,
                "0 or 1",
                f"Whether the {percent} % interval holds the truth",
                bounds=PROBABILITY,
                decimals=0,
            )
            for percent in INTERVALS
        ),
        *(
            _number(f"width_{percent}", _POINTS, f"Width of the {percent} % interval", bounds=ANY_COUNT)
            for percent in INTERVALS
        ),
    ),
)

FITS = TableSchema(
    "tables/elections.csv",
    "election",
    (
        ELECTION,
        whole_column("silent_days", "days", "From the last publication of a poll to polling day"),
        whole_column("polls", "–", "Polls in the fit"),
        yes_no_column("passed", "Whether the checks of the fit passed"),
        whole_column("divergences", "–", "Divergent transitions"),
        _number(
            "chi_square",
            "–",
            "Sum of the squared whitened errors of national support on polling day",
            bounds=ANY_COUNT,
        ),
        whole_column("degrees", "–", "How many they are: what the sum is on average, where all is right"),
        _number(
            "brier",
            "0 to 2",
            "Brier score of the chances of seats, summed over parties, mean over seats",
            decimals=4,
            blank="no seats",
        ),
    ),
)

COVERAGE = TableSchema(
    "tables/coverage.csv",
    "group of numbers and stated percentage",
    (
        GROUP,
        whole_column("stated", "percent", "What the intervals say of themselves"),
        ELECTIONS,
        whole_column("intervals", "–", "Number of intervals"),
        _number("inside", "percent", "Part of them that hold the truth", bounds=PERCENT),
        *_interval("percent", "that part", bounds=PERCENT),
    ),
)

SCORES = TableSchema(
    "tables/scores.csv",
    "group of numbers",
    (
        GROUP,
        ELECTIONS,
        whole_column("numbers", "–", "Number of estimates"),
        _number("mean_absolute_error", _POINTS, "Mean distance of estimate and truth", bounds=ANY_COUNT),
        _number("crps", _POINTS, "Mean continuous ranked probability score", decimals=3),
        *(
            _number(f"width_{percent}", _POINTS, f"Mean width of the {percent} % intervals", bounds=ANY_COUNT)
            for percent in INTERVALS
        ),
    ),
)

PLACES = TableSchema(
    "tables/places.csv",
    "kind of number and code",
    (
        KIND,
        Column("code", ColumnType.CODE, "–", "Party code; `any` for one drawn by lot in each election"),
        yes_no_column(
            "inside", "Whether all places lie inside the 95 % band that holds all codes of the kind"
        ),
        _number(
            "chance", "0 to 1", "Of uniform places that stray as far, by another test", decimals=4,
            bounds=PROBABILITY,
        ),
        _number("in_50", "0 to 1", "Part of the truths inside the 50 % interval", bounds=PROBABILITY),
        _number("in_90", "0 to 1", "Part of the truths inside the 90 % interval", bounds=PROBABILITY),
        _number("bias", "standard errors", "Mean place less a half"),
        _number(
            "spread",
            "–",
            "Variance of the places over that of uniform ones: above 1 where intervals are too narrow",
            bounds=ANY_COUNT,
        ),
    ),
)  # fmt: skip

CHANCES = TableSchema(
    "tables/chances.csv",
    "bin of chances of seats",
    (
        _number("chance_from", "0 to 1", "Lower end of the bin", bounds=PROBABILITY),
        _number("chance_to", "0 to 1", "Upper end of the bin", bounds=PROBABILITY),
        whole_column("forecasts", "–", "Chances in the bin"),
        _number("mean_chance", "0 to 1", "Their mean", decimals=4, bounds=PROBABILITY),
        whole_column("won", "–", "How many of them came true"),
        _number("share_won", "0 to 1", "Part of them that came true", decimals=4, bounds=PROBABILITY),
        whole_column("once", "–", "Different elections, seats and parties in the bin"),
        _number(
            "low",
            "0 to 1",
            "Lower end of the exact binomial 90 % band of that part, were all seats independent",
            bounds=PROBABILITY,
        ),
        _number("high", "0 to 1", "Upper end of that band", bounds=PROBABILITY),
    ),
)

NOTICED = TableSchema(
    "tables/noticed.csv",
    "thing that the program says of itself",
    (
        _text("kind", "warning of the reading, screen, predictive check, or check of the fit"),
        _text("name", "Which"),
        _number("elections", "percent", "Part of the elections in which it is said", bounds=PERCENT),
        _number("mean_count", "–", "How often, on average over all elections", bounds=ANY_COUNT),
    ),
)

CHECKS = TableSchema(
    "tables/verdict.csv",
    "check",
    (
        _text("check", "What is checked"),
        _number("value", "–", "What was found", decimals=1),
        _text("limit", "What it is held to"),
        yes_no_column("passed", "Whether it holds"),
        _text("meaning", "What a failure would mean"),
    ),
)

DAMAGE = TableSchema(
    "tables/damage.csv",
    "group of numbers",
    (
        GROUP,
        ELECTIONS,
        _number(
            "inside_honest",
            "percent",
            "Part of the 90 % intervals that hold the truth without the violation",
            bounds=PERCENT,
        ),
        _number("inside_violated", "percent", "The same with it", bounds=PERCENT),
        _number("crps_ratio", "–", "Mean CRPS with it over that without", decimals=3, bounds=ANY_COUNT),
        *_interval("–", "that ratio", bounds=ANY_COUNT, decimals=3),
        _number("error_ratio", "–", "The same of mean absolute errors", decimals=3, bounds=ANY_COUNT),
        _number("width_ratio", "–", "The same of widths of 90 % intervals", decimals=3, bounds=ANY_COUNT),
    ),
)

ALARMS = TableSchema(
    "tables/alarms.csv",
    "thing that the program says of itself, the largest difference first",
    (
        _text("kind", "As in `noticed.csv`"),
        _text("name", "Which"),
        _number("honest", "percent", "Part of the elections without the violation", bounds=PERCENT),
        _number("violated", "percent", "Part of the elections with it", bounds=PERCENT),
        _number("count_honest", "–", "How often without it, on average", bounds=ANY_COUNT),
        _number("count_violated", "–", "How often with it", bounds=ANY_COUNT),
    ),
)

CALIBRATION_SCHEMAS = (
    NUMBERS,
    FITS,
    COVERAGE,
    SCORES,
    PLACES,
    CHANCES,
    NOTICED,
    CHECKS,
    DAMAGE,
    ALARMS,
)
