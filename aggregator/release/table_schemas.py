"""What every table of a release holds: column by column, in one place.

Tables are checked against these schemas before they are written, and ``docs/formats.md`` is checked against
them by a test, so that neither can drift away.
"""

from __future__ import annotations

from aggregator.release.check_schemas import ASSUMPTIONS, PREDICTIVE, PRIOR_SENSITIVITY
from aggregator.release.lean_schemas import HOUSES, MODE_LEANS
from aggregator.release.rounding import SHARE_DECIMALS_TABLE
from aggregator.release.screens_schema import SCREENS
from aggregator.release.seats_schemas import (
    CHANCES,
    COMBINATIONS,
    DECIDING_SEATS,
    SEAT_CHANCES,
    SEATS,
    SEATS_VOTES,
)
from aggregator.release.table_columns import (
    ANY_COUNT,
    ANY_NUMBER,
    CODE,
    DATE,
    KIND,
    LEVEL,
    PERCENT,
    Column,
    ColumnType,
    TableSchema,
    date_column,
    number_column,
    quantile_columns,
    typed_column,
    whole_column,
    yes_no_column,
)

CAUTION = Column(
    "caution",
    ColumnType.TEXT,
    "–",
    "Why the table must not be relied on; present only in a release whose checks failed",
)
"""The last column of every table of a release whose checks failed."""


SUPPORT = TableSchema(
    "public/support.csv",
    "date, region, code and kind",
    (
        DATE,
        Column("region", ColumnType.CODE, "–", "Region code", blank="the whole country"),
        CODE,
        LEVEL,
        KIND,
        *quantile_columns(
            "percent of the vote", of="support", bounds=PERCENT, decimals=SHARE_DECIMALS_TABLE, whole=False
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
    COMBINATIONS,
    SEAT_CHANCES,
    DECIDING_SEATS,
    SEATS_VOTES,
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
