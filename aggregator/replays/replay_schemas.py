"""What the tables of a replay report hold, column by column."""

from __future__ import annotations

from aggregator.release.table_columns import (
    ANY_COUNT,
    ANY_NUMBER,
    CODE,
    LEVEL,
    PROBABILITY,
    Column,
    ColumnType,
    TableSchema,
    date_column,
    number_column,
    typed_column,
    whole_column,
    yes_no_column,
)
from aggregator.release.table_words import Level
from aggregator.replays.distribution_scores import INTERVALS
from aggregator.replays.methods import LEADS, Method, Nearer, Quantity, Where

_UNIT = "percent, or seats"
_POINTS = "points, or seats"
_NO_DRAWS = "a rival, which gives one number and no interval"
_NO_CODE = "all parties together, others left out"

CONTEST = typed_column("contest", "Title of the contest")
AS_OF = date_column("as_of", "The replayed day: only what was published by then was known")
DAYS_BEFORE = whole_column("days_before", "days", "From that day to polling day")
METHOD = Column(
    "method",
    ColumnType.TEXT,
    "–",
    "`fieldfold`: this program. `latest_poll`: the last poll published. `mean_30_days`: mean of the polls "
    "whose fieldwork ended in the 30 days before. `decaying_mean`: all polls, weighed by respondents, half "
    "as much for every 30 days. `last_result`: no change. `uniform_swing`: in every seat (and region) the "
    "last result plus the change of the decaying mean since; the leader takes the seat",
    allowed=tuple(Method),
)
QUANTITY = Column(
    "quantity", ColumnType.TEXT, "–", "Support or seats, on polling day", allowed=tuple(Quantity)
)
WHERE = Column(
    "where", ColumnType.TEXT, "–", "Figures of the country, or of its regions", allowed=tuple(Where)
)
LEAD = Column(
    "lead", ColumnType.TEXT, "days", "Days before polling day", allowed=tuple(lead.label for lead in LEADS)
)


def _inside(percent: int) -> Column:
    return Column(
        f"inside_{percent}",
        ColumnType.WHOLE,
        "0 or 1",
        f"Whether the {percent} % interval holds the truth",
        bounds=PROBABILITY,
        decimals=0,
        blank=_NO_DRAWS,
    )


def _score(name: str, unit: str, meaning: str, *, blank: str | None = None, decimals: int = 3) -> Column:
    return number_column(name, unit, meaning, bounds=ANY_NUMBER, blank=blank, decimals=decimals)


def _band(once: str) -> tuple[Column, ...]:
    return (
        whole_column("once", "–", f"{once}, each counted once per contest"),
        number_column(
            "low",
            "0 to 1",
            "Lower end of the exact binomial 90 % band of the share, were all forecasts right and the `once` "
            "independent; they are not quite, so that right forecasts leave the band more often",
            bounds=PROBABILITY,
        ),
        number_column("high", "0 to 1", "Upper end of that band", bounds=PROBABILITY),
    )


_HELD = tuple(
    number_column(
        f"inside_{percent}",
        "percent",
        f"How often the {percent} % interval held the truth",
        decimals=1,
        blank=_NO_DRAWS,
    )
    for percent in INTERVALS
)

SCORES = TableSchema(
    "tables/scores.csv",
    "contest, replayed day, method, quantity, region and code",
    (
        CONTEST,
        AS_OF,
        DAYS_BEFORE,
        METHOD,
        QUANTITY,
        Column("region", ColumnType.CODE, "–", "Region code", blank="the whole country"),
        CODE,
        LEVEL,
        _score("estimate", _UNIT, "What the method said of polling day; the mean of the draws", decimals=2),
        _score("truth", _UNIT, "The result", decimals=2),
        _score("error", _POINTS, "Estimate minus truth", decimals=2),
        _score(
            "crps",
            _POINTS,
            "Continuous ranked probability score, smaller is better; of a rival, its absolute error",
        ),
        _score(
            "log_score",
            "–",
            "Minus the logarithm of the density (percent scale) or chance (seats) given to the truth; "
            "smaller is better",
            blank=_NO_DRAWS,
        ),
        *(
            _score(f"width_{p}", _POINTS, f"Width of the {p} % interval", blank=_NO_DRAWS, decimals=2)
            for p in INTERVALS
        ),
        *(_inside(percent) for percent in INTERVALS),
        number_column(
            "pit",
            "0 to 1",
            "Place of the truth among the draws; drawn at random within a whole number's own step",
            bounds=PROBABILITY,
            decimals=4,
            blank=_NO_DRAWS,
        ),
        _score("low_90", _UNIT, "Lower end of the 90 % interval", blank=_NO_DRAWS, decimals=2),
        _score("high_90", _UNIT, "Upper end of the 90 % interval", blank=_NO_DRAWS, decimals=2),
    ),
)

SEAT_SCORES = TableSchema(
    "tables/seat_scores.csv",
    "contest, replayed day and method that knows seats",
    (
        CONTEST,
        AS_OF,
        DAYS_BEFORE,
        METHOD,
        whole_column("seats", "seats", "Seats scored"),
        _score(
            "brier",
            "0 to 2",
            "Brier score of a seat, summed over its parties, mean over seats; smaller is better",
        ),
        _score(
            "log_score",
            "–",
            "Minus the logarithm of the chance given to the winner, mean over seats",
            blank="a rival, which is always sure: one mistake would make it infinite",
        ),
        _score("leaders_wrong", "seats", "Seats whose likeliest party did not win", decimals=1),
    ),
)

RELIABILITY = TableSchema(
    "tables/reliability.csv",
    "bin of chances of seats, all replayed days together",
    (
        _score("chance_from", "0 to 1", "Lower end of the bin", decimals=2),
        _score("chance_to", "0 to 1", "Upper end", decimals=2),
        whole_column("forecasts", "forecasts", "Chances in the bin"),
        _score("mean_chance", "0 to 1", "Their mean", decimals=4),
        whole_column("won", "forecasts", "How many came true"),
        _score("share_won", "0 to 1", "Their share", decimals=4),
        *_band("Different seats and parties"),
    ),
)

PLACES = TableSchema(
    "tables/places.csv",
    "quantity and tenth of the draws",
    (
        QUANTITY,
        _score("place_from", "0 to 1", "Lower end of the tenth", decimals=1),
        _score("place_to", "0 to 1", "Upper end", decimals=1),
        whole_column(
            "forecasts", "forecasts", "Forecasts whose truth lay there (`pit` of parties and others)"
        ),
        _score("share", "0 to 1", "Their share; a tenth is right", decimals=4),
        *_band("Different parties"),
    ),
)

SUMMARY = TableSchema(
    "tables/summary.csv",
    "method, quantity, where and days before polling day",
    (
        METHOD,
        QUANTITY,
        WHERE,
        LEAD,
        whole_column("contests", "contests", "Contests"),
        whole_column("dates", "dates", "Replayed days on which the method had something to say"),
        whole_column("figures", "figures", "Figures scored; alliances are left out"),
        _score("mean_absolute_error", _POINTS, "Mean absolute error", decimals=2),
        _score("root_mean_square_error", _POINTS, "Root mean square error", decimals=2),
        _score("crps", _POINTS, "Mean of `crps`"),
        _score("log_score", "–", "Mean of `log_score`", blank=_NO_DRAWS),
        *(
            _score(f"width_{p}", _POINTS, f"Mean width of the {p} % interval", blank=_NO_DRAWS, decimals=2)
            for p in INTERVALS
        ),
        *_HELD,
    ),
)

COMPARISONS = TableSchema(
    "tables/comparisons.csv",
    "quantity, where, days before polling day and rival",
    (
        QUANTITY,
        WHERE,
        LEAD,
        Column("rival", ColumnType.TEXT, "–", "The other method", allowed=tuple(Method)[1:]),
        whole_column("contests", "contests", "Contests"),
        whole_column("dates", "dates", "Replayed days on which both had something to say"),
        Column(
            "unit",
            ColumnType.TEXT,
            "–",
            "What repeats: contests, or in a single one its dates",
            allowed=("contest", "date"),
        ),
        _score(
            "units",
            "–",
            "How many independent ones that comes to: neighbouring dates are nearly the same",
            decimals=1,
        ),
        _score("own_error", _POINTS, "Mean absolute error of this program", decimals=2),
        _score("rival_error", _POINTS, "The rival's", decimals=2),
        _score("difference", _POINTS, "The rival's minus this program's", decimals=2),
        _score(
            "standard_error",
            _POINTS,
            "Standard error of the difference, over `units`",
            decimals=2,
            blank="the dates come to one forecast",
        ),
        _score("own_crps", _POINTS, "Mean CRPS of this program"),
        _score("rival_crps", _POINTS, "The rival's: its absolute error"),
        Column(
            "nearer",
            ColumnType.TEXT,
            "–",
            "Who came nearer by absolute error, if the difference is above its standard error. In a single "
            "contest this is said of that election alone",
            allowed=tuple(Nearer),
        ),
    ),
)

STALENESS = TableSchema(
    "tables/staleness.csv",
    "band of days before polling day and code",
    (
        whole_column("days_from", "days", "Days before polling day, from"),
        whole_column("days_to", "days", "to, included"),
        Column("code", ColumnType.CODE, "–", CODE.meaning, blank=_NO_CODE),
        Column("level", ColumnType.TEXT, "–", LEVEL.meaning, allowed=tuple(Level)),
        whole_column("contests", "contests", "Contests measured, each counted once"),
        whole_column("polls", "polls", "Polls with fieldwork then (its middle)"),
        number_column(
            "poll_error", "percentage points", "Root mean square error of their figures", blank="no poll then"
        ),
        whole_column("sample", "respondents", "Their median sample", blank="no poll then"),
        number_column(
            "expected_error",
            "percentage points",
            "What the formula of `shelf_life.csv` expects of a poll of 1,000 by a typical house taken "
            "then; root mean square over the replayed days that speak of it",
            blank="no replayed day speaks of it, or an alliance",
        ),
        whole_column("estimates", "dates", "Replayed days then"),
        number_column(
            "estimate_error",
            "percentage points",
            "Root mean square error of their estimates",
            blank="no replayed day then",
        ),
        number_column(
            "estimate_expected",
            "percentage points",
            "The standard deviation those estimates claimed, from their 90 % intervals",
            blank="no replayed day then",
        ),
    ),
)

BY_SIZE = TableSchema(
    "tables/by_size.csv",
    "size of party, days before polling day and method",
    (
        METHOD,
        _score("size_from", "percent", "Support as this program estimated it, from", decimals=0),
        _score("size_to", "percent", "to", decimals=0),
        LEAD,
        whole_column("contests", "contests", "Contests, each counted once"),
        whole_column("figures", "figures", "Figures scored; alliances are left out"),
        number_column(
            "mean_absolute_error", "percentage points", "Mean absolute error of support in the country"
        ),
        number_column(
            "standard_error",
            "percentage points",
            "Its standard error over contests",
            blank="one contest",
            bounds=ANY_COUNT,
        ),
        _score(
            "mean_error", "percentage points", "Mean error: above zero, the estimate was too high", decimals=2
        ),
        _score("crps", "percentage points", "Mean CRPS"),
        *_HELD,
        _score(
            "width_90", "percentage points", "Mean width of the 90 % interval", blank=_NO_DRAWS, decimals=2
        ),
    ),
)

FITS = TableSchema(
    "tables/fits.csv",
    "replayed day",
    (
        AS_OF,
        yes_no_column("passed", "Whether the checks of the fit passed"),
        Column("verdict", ColumnType.TEXT, "–", "The judgement in words", blank="not recorded"),
        whole_column("divergences", "steps", "Divergent steps", blank="not recorded"),
        _score("worst_rhat", "–", "Largest R-hat", decimals=4, blank="not recorded"),
        _score(
            "least_tail_ess",
            "draws",
            "Least effective sample size of a tail",
            decimals=0,
            blank="not recorded",
        ),
        whole_column("polls_used", "polls", "Polls known by then", blank="not recorded"),
        date_column("last_fieldwork", "Last day of fieldwork known by then", blank="not recorded"),
        whole_column("seed", "–", "Seed of the fit", blank="not recorded"),
        _score("seconds", "seconds", "What the fit took", decimals=1, blank="not recorded"),
    ),
)

REPLAY_SCHEMAS = (
    SCORES, SEAT_SCORES, RELIABILITY, PLACES, SUMMARY, COMPARISONS, STALENESS, BY_SIZE, FITS,
)  # fmt: skip
