"""What the tables hold that put the fit itself to the test: other assumptions, figures foreseen, priors."""

from __future__ import annotations

from aggregator.release.table_columns import (
    ANY_COUNT,
    ANY_NUMBER,
    CODE,
    LEVEL,
    PERCENT,
    Column,
    ColumnType,
    TableSchema,
    chance_column,
    number_column,
    typed_column,
    whole_column,
    yes_no_column,
)

_REFIT = "the draws of this run cannot say: the model would have to be fitted again"
_NO_SEATS = "nothing is counted in seats, or the draws of this run cannot say"
_NO_LEADER = f"an alliance or others; {_NO_SEATS}"

ASSUMPTIONS = TableSchema(
    "public/assumptions.csv",
    "assumption, setting and code",
    (
        Column("assumption", ColumnType.TEXT, "–", "What is assumed"),
        Column("setting", ColumnType.TEXT, "–", "How it is set"),
        yes_no_column("in_use", "Whether all other tables stand on this setting"),
        CODE,
        LEVEL,
        number_column("mean", "percent of the vote", "Mean of support on polling day", blank=_REFIT),
        number_column("q05", "percent of the vote", "Support is below this with chance 5 %", blank=_REFIT),
        number_column("q95", "percent of the vote", "Support is below this with chance 95 %", blank=_REFIT),
        number_column(
            "seats_mean", "seats", "Mean of seats on polling day", bounds=ANY_COUNT, blank=_NO_SEATS
        ),
        whole_column("seats_q05", "seats", "Seats are below this with chance 5 %", blank=_NO_SEATS),
        whole_column("seats_q95", "seats", "Seats are below this with chance 95 %", blank=_NO_SEATS),
        chance_column("largest", "Chance of more seats than any other party", blank=_NO_LEADER),
        chance_column("majority_alone", "Chance of a majority by itself", blank=_NO_LEADER),
    ),
)

PREDICTIVE = TableSchema(
    "desk/predictive.csv",
    "house and code",
    (
        typed_column("house", "The polling organisation", blank="all houses together"),
        Column(
            "code",
            ColumnType.CODE,
            "–",
            "Party or alliance of the figure, as in `contest.toml`",
            blank="all codes together",
        ),
        whole_column("figures", "figures", "Published figures in the fit"),
        number_column(
            "inside_50",
            "percent",
            "Part of the figures inside the central 50 % of what the model would have expected",
            bounds=PERCENT,
        ),
        number_column("inside_90", "percent", "Part of the figures inside the central 90 %", bounds=PERCENT),
        number_column(
            "mean_z",
            "standard deviations",
            "Mean distance of the figures from what was expected, in standard deviations of what the model "
            "would have expected; below zero: figures lie lower",
            bounds=ANY_NUMBER,
        ),
        number_column(
            "spread_z",
            "standard deviations",
            "Root mean square of the same distance: about 1 where the noise of the polls is as it should be",
            bounds=ANY_COUNT,
        ),
        yes_no_column(
            "stands_out",
            "Whether the figures of the house are too far from, or too near to, what was expected: their "
            "ranks leave the band that would hold them with chance 98 %, all houses taken together",
            blank="said of a house as a whole only",
        ),
    ),
)

_NOISE = "too small to be told from the noise of the draws"

PRIOR_SENSITIVITY = TableSchema(
    "desk/prior_sensitivity.csv",
    "quantity and code",
    (
        Column(
            "quantity",
            ColumnType.TEXT,
            "–",
            "Support on the day of the run, support or seats on polling day, of the largest parties",
            allowed=("support_on_date", "support_on_polling_day", "seats_on_polling_day"),
        ),
        CODE,
        number_column(
            "prior",
            "per doubling",
            "How far the number's distribution moves with the priors of the model's scales (power-scaling; "
            "above 0.05 counts as sensitive)",
            bounds=ANY_COUNT,
            decimals=3,
            blank=_NOISE,
        ),
        number_column(
            "shared_lean",
            "per doubling",
            "The same for the assumed error that all polls share",
            bounds=ANY_COUNT,
            decimals=3,
            blank=_NOISE,
        ),
        number_column(
            "polls",
            "per doubling",
            "The same for the polls",
            bounds=ANY_COUNT,
            decimals=3,
            blank=_NOISE,
        ),
        number_column(
            "variance_shared_lean",
            "percent",
            "Part of the number's variance that comes from the assumed shared error",
        ),
        number_column(
            "variance_drift",
            "percent",
            "Part of its variance that comes from opinion moving between the run and polling day",
        ),
        number_column(
            "variance_polls",
            "percent",
            "The rest: what samples, houses, regions and turnout leave open",
        ),
        Column("words", ColumnType.TEXT, "–", "The same in a sentence"),
    ),
)
