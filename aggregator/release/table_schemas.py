"""What every table of a release holds: column by column, in one place.

Tables are checked against these schemas before they are written, and ``docs/formats.md`` is checked against
them by a test, so that neither can drift away.
"""

from __future__ import annotations

from aggregator.release.check_schemas import ASSUMPTIONS, PREDICTIVE, PRIOR_SENSITIVITY
from aggregator.release.lean_schemas import HOUSES, MODE_LEANS
from aggregator.release.likelihood_words import LIKELIHOOD_WORDS
from aggregator.release.rounding import CHANCE_DECIMALS, SHARE_DECIMALS_TABLE
from aggregator.release.screens_schema import SCREENS
from aggregator.release.table_columns import (
    ANY_COUNT,
    ANY_NUMBER,
    CODE,
    LEVEL,
    PERCENT,
    PROBABILITY,
    Bounds,
    Column,
    ColumnType,
    TableSchema,
    date_column,
    number_column,
    typed_column,
    whole_column,
    yes_no_column,
)
from aggregator.release.table_words import Kind
from aggregator.seats.majorities import Outcome

CAUTION = Column(
    "caution",
    ColumnType.TEXT,
    "–",
    "Why the table must not be relied on; present only in a release whose checks failed",
)
"""The last column of every table of a release whose checks failed."""


_DATE = date_column("date", "The day the estimate is for; for `on_polling_day` the polling day of the region")
_KIND = Column(
    "kind",
    ColumnType.TEXT,
    "–",
    "`on_date`: on that day. `on_polling_day`: when people vote, drift until then included",
    allowed=tuple(Kind),
)


def _quantiles(unit: str, *, of: str, bounds: Bounds, decimals: int, whole: bool) -> tuple[Column, ...]:
    quantile = whole_column if whole else number_column
    options = {} if whole else {"bounds": bounds, "decimals": decimals}
    words = {"q05": "5 %", "q25": "25 %", "q50": "50 % (the median)", "q75": "75 %", "q95": "95 %"}
    return (
        number_column("mean", unit, f"Mean of {of} over the draws", bounds=bounds, decimals=decimals),
        number_column("sd", unit, "Standard deviation over the draws", bounds=bounds, decimals=decimals),
        *(
            quantile(name, unit, f"{of[0].upper()}{of[1:]} is below this with chance {word}", **options)  # type: ignore[arg-type]
            for name, word in words.items()
        ),
    )


SUPPORT = TableSchema(
    "public/support.csv",
    "date, region, code and kind",
    (
        _DATE,
        Column("region", ColumnType.CODE, "–", "Region code", blank="the whole country"),
        CODE,
        LEVEL,
        _KIND,
        *_quantiles(
            "percent of the vote", of="support", bounds=PERCENT, decimals=SHARE_DECIMALS_TABLE, whole=False
        ),
    ),
)

SEATS = TableSchema(
    "public/seats.csv",
    "date, code and kind",
    (
        _DATE,
        CODE,
        LEVEL,
        _KIND,
        *_quantiles("seats", of="the number of seats", bounds=ANY_COUNT, decimals=2, whole=True),
    ),
)

CHANCES = TableSchema(
    "public/chances.csv",
    "date, kind, outcome and code",
    (
        _DATE,
        _KIND,
        Column(
            "outcome",
            ColumnType.TEXT,
            "–",
            "`most_support`: more votes than any other party. `largest`: more seats than any other party. "
            "`majority_alone`: reaches the majority line by itself. `majority_only_as_alliance`: the "
            "alliance reaches it and no member does alone. `no_majority`: neither a party nor an alliance "
            "reaches it. `OTH` is not a party: it leads nothing and has no majority",
            allowed=tuple(Outcome),
        ),
        Column(
            "code",
            ColumnType.CODE,
            "–",
            "Party, or alliance for `majority_only_as_alliance`",
            blank="`no_majority`, which has no code",
        ),
        number_column(
            "probability",
            "0 to 1",
            "Chance of the outcome: (k + ½)/(S + 1) for k of S draws, so never 0 or 1. A tie for the lead "
            "counts in equal parts",
            decimals=CHANCE_DECIMALS,
            bounds=PROBABILITY,
        ),
        number_column(
            "mc_error",
            "0 to 1",
            "Monte Carlo standard error of the probability: what another seed may change",
            decimals=CHANCE_DECIMALS,
            bounds=PROBABILITY,
        ),
        Column(
            "likelihood",
            ColumnType.TEXT,
            "–",
            "The narrowest band of the IPCC likelihood scale that holds the probability",
            allowed=LIKELIHOOD_WORDS,
        ),
    ),
)

SEAT_CHANCES = TableSchema(
    "public/seat_chances.csv",
    "seat and code",
    (
        Column("seat", ColumnType.CODE, "–", "Seat code, as in `result_last.csv`", from_register=True),
        typed_column("name", "Name of the seat", blank="not given"),
        Column("region", ColumnType.CODE, "–", "Region of the seat"),
        CODE,
        number_column(
            "last_share", "percent of the vote", "Share at the last election", blank="did not stand there"
        ),
        number_column("expected_share", "percent of the vote", "Mean share on polling day"),
        number_column(
            "chance",
            "0 to 1",
            "Chance of winning the seat on polling day, never 0 or 1",
            decimals=CHANCE_DECIMALS,
            bounds=PROBABILITY,
        ),
    ),
)

_WORTH = {
    "worth_today": "Fresh respondents of the same house, asked on the day of the run, that would tell as "
    "much about support on that day",
    "worth_polling_day": "Respondents interviewed on polling day that would tell as much about support "
    "on polling day",
}

SHELF_LIFE = TableSchema(
    "public/shelf_life.csv",
    "age in days and code",
    (
        whole_column(
            "age_days",
            "days",
            "Age of a poll of 1,000 respondents of a typical house, on the day of the run",
        ),
        CODE,
        LEVEL,
        *(
            number_column(
                f"{name}{end}",
                "respondents",
                f"{meaning}: {word} over the draws",
                decimals=0,
                bounds=ANY_COUNT,
            )
            for name, meaning in _WORTH.items()
            for end, word in (("", "median"), ("_q05", "5 % quantile"), ("_q95", "95 % quantile"))
        ),
        number_column(
            "expected_error",
            "percentage points",
            "Root mean square error to expect of that poll's own figure against the result on polling day: "
            "the poll has this age on the day of the run, and polling day is yet to come",
        ),
        number_column(
            "error_sampling",
            "percentage points",
            "The part of `expected_error` from sampling and weighting; parts add up in squares",
        ),
        number_column("error_house", "percentage points", "The part from the house's lean"),
        number_column("error_shared_lean", "percentage points", "The part from a lean shared by all houses"),
        number_column(
            "error_drift",
            "percentage points",
            "The part from opinion moving between fieldwork and polling day: over the poll's age and the "
            "days left after the run",
        ),
    ),
)

POLLS_USED = TableSchema(
    "public/polls_used.csv",
    "poll in the fit",
    (
        typed_column("poll", "Identifier of the poll"),
        typed_column("house", "Who did the fieldwork"),
        typed_column("sponsor", "Who paid for it", blank="not given"),
        date_column("start", "First day of fieldwork", blank="not given"),
        date_column("end", "Last day of fieldwork"),
        date_column(
            "published", "Day of publication", blank="not given; the last day of fieldwork is assumed"
        ),
        Column("regions", ColumnType.TEXT, "–", "Regions asked, joined by `+`", blank="the whole country"),
        whole_column("sample", "respondents", "Sample size as reported", blank="not given"),
        whole_column(
            "respondents", "respondents", "Respondents counted, once each, after the undecided were set aside"
        ),
        typed_column("mode", "How people were asked", blank="not given"),
        typed_column("population", "Who was asked", blank="not given"),
        typed_column("method", "The house's label for its way of working", blank="not given"),
        number_column(
            "undecided",
            "percent",
            "Undecided, set aside before the fit",
            blank="already left out by the house, or not given",
        ),
        number_column(
            "worth_today",
            "respondents",
            "Fresh respondents of the same house that would tell as much today about the party with most "
            "support",
            decimals=0,
            bounds=ANY_COUNT,
            blank="not worked out",
        ),
        typed_column("source", "Where the poll was published", blank="not given"),
    ),
)

POLLS_WEIGHED = TableSchema(
    "desk/polls_weighed.csv",
    "row of the register",
    (
        typed_column("poll", "Identifier of the poll", blank="not given"),
        whole_column("row", "row", "Row of the register as a spreadsheet counts it (the header is row 1)"),
        typed_column("house", "Who did the fieldwork", blank="not given"),
        date_column("start", "First day of fieldwork", blank="not given"),
        date_column("end", "Last day of fieldwork", blank="not given"),
        yes_no_column("used", "Whether the row is in the fit"),
        typed_column("why_not", "Why the row is not in the fit", blank="it is"),
        whole_column(
            "respondents",
            "respondents",
            "Respondents of this row, after the undecided were set aside",
            blank="not in the fit",
        ),
        number_column(
            "worth_today",
            "respondents",
            "As in `polls_used.csv`",
            decimals=0,
            bounds=ANY_COUNT,
            blank="not in the fit, or not worked out",
        ),
        number_column(
            "pareto_k",
            "–",
            "Pareto shape of the poll's importance weights: above 0.7 the model finds the poll hard to "
            "foresee; read it again",
            bounds=ANY_NUMBER,
            blank="not worked out",
        ),
        typed_column("warnings", "What was doubtful about the row when it was read", blank="nothing"),
        Column(
            "screens",
            ColumnType.TEXT,
            "–",
            "Screens of `screens.csv` in which the poll appears, joined by `; `",
            blank="none, or not in the fit",
        ),
    ),
)

ALL_SCHEMAS = (
    SUPPORT,
    SEATS,
    CHANCES,
    SEAT_CHANCES,
    HOUSES,
    MODE_LEANS,
    SHELF_LIFE,
    ASSUMPTIONS,
    POLLS_USED,
    POLLS_WEIGHED,
    SCREENS,
    PREDICTIVE,
    PRIOR_SENSITIVITY,
)
