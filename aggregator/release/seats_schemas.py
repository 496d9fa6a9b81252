"""What the tables about seats hold: seats, chances, combinations, single seats, seats against votes."""

from __future__ import annotations

from aggregator.release.likelihood_words import LIKELIHOOD_WORDS, NAMED_LEADER_FROM
from aggregator.release.table_columns import (
    ANY_COUNT,
    ANY_NUMBER,
    CODE,
    DATE,
    KIND,
    LEVEL,
    Column,
    ColumnType,
    TableSchema,
    chance_column,
    number_column,
    quantile_columns,
    typed_column,
    whole_column,
    yes_no_column,
)
from aggregator.release.table_words import SeatsVotes
from aggregator.seats.combinations import MOST_COMBINATIONS, MOST_PARTIES
from aggregator.seats.majorities import REAL_CHANCE, Outcome

_SEAT = (
    Column("seat", ColumnType.CODE, "–", "Seat code, as in `result_last.csv`", from_register=True),
    typed_column("name", "Name of the seat", blank="not given"),
    Column("region", ColumnType.CODE, "–", "Region of the seat"),
)


def _error_and_word(of: str) -> tuple[Column, Column]:
    return (
        chance_column("mc_error", f"Monte Carlo standard error of {of}: what another seed may change"),
        Column(
            "likelihood",
            ColumnType.TEXT,
            "–",
            f"The narrowest band of the IPCC likelihood scale that holds {of}",
            allowed=LIKELIHOOD_WORDS,
        ),
    )


SEATS = TableSchema(
    "public/seats.csv",
    "date, code and kind",
    (
        DATE,
        CODE,
        LEVEL,
        KIND,
        *quantile_columns("seats", of="the number of seats", bounds=ANY_COUNT, decimals=2, whole=True),
    ),
)

CHANCES = TableSchema(
    "public/chances.csv",
    "date, kind, outcome and code",
    (
        DATE,
        KIND,
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
        chance_column(
            "probability",
            "Chance of the outcome: (k + ½)/(S + 1) for k of S draws, so never 0 or 1. A tie for the lead "
            "counts in equal parts",
        ),
        *_error_and_word("the probability"),
    ),
)

SEAT_CHANCES = TableSchema(
    "public/seat_chances.csv",
    "seat and code",
    (
        *_SEAT,
        CODE,
        number_column(
            "last_share", "percent of the vote", "Share at the last election", blank="did not stand there"
        ),
        number_column("expected_share", "percent of the vote", "Mean share on polling day"),
        chance_column("chance", "Chance of winning at least one of its members on polling day, never 0 or 1"),
        whole_column("members", "members", "Members that the seat or district elects"),
        number_column(
            "expected_members",
            "members",
            "Mean number of its members that the code wins on polling day; where one is elected, the part of "
            "the draws in which it wins",
            bounds=ANY_COUNT,
        ),
    ),
)

COMBINATIONS = TableSchema(
    "public/combinations.csv",
    "date, kind and combination of parties",
    (
        DATE,
        KIND,
        Column(
            "combination",
            ColumnType.TEXT,
            "–",
            "Codes of its parties, joined by `+`. Arithmetic only: nothing is said of who would work with "
            "whom. There is a row where the combination is minimal (reaches the majority line, and would "
            f"not without any one of its parties) with a chance of {REAL_CHANCE:g} or more on that day; of "
            f"more than {MOST_COMBINATIONS} a day the likeliest are kept, and only the {MOST_PARTIES} "
            "parties with most seats enter. `OTH` is not a party and enters none",
        ),
        Column(
            "alliance",
            ColumnType.CODE,
            "–",
            "The alliance of that day with exactly these members",
            blank="none",
        ),
        whole_column("parties", "parties", "How many parties it has"),
        chance_column("chance", "Chance that it reaches the majority line, never 0 or 1"),
        chance_column(
            "chance_minimal",
            "Chance that it reaches the line and would not without any one of its parties, never 0 or 1",
        ),
        *_error_and_word("`chance`"),
        number_column("mean", "seats", "Mean of its seats over the draws", bounds=ANY_COUNT),
        whole_column("q05", "seats", "Its seats are below this with chance 5 %"),
        whole_column("q95", "seats", "Its seats are below this with chance 95 %"),
    ),
)

DECIDING_SEATS = TableSchema(
    "public/deciding_seats.csv",
    "seat that elects one member and is not counted yet, and code with a chance of a majority of 1 % or "
    "more; not where list seats make up for seats won, so that one more of these is one less of those",
    (
        *_SEAT,
        CODE,
        LEVEL,
        chance_column(
            "chance",
            "Chance that the code wins the seat on polling day (an alliance: that any member does), never 0 "
            "or 1",
        ),
        chance_column(
            "decides",
            "Part of the draws in which this seat decides: of the code's seats in the order of its lead (won "
            "ones first), the one with which it reaches the majority line, what it holds elsewhere counted. "
            "Sums to 1 over the seats of a code, less the draws in which the line lies outside them",
        ),
        number_column(
            "carries",
            "percent",
            "Part of the variance of the code's seats that comes with this seat: covariance of winning it "
            "and the code's seats, over their variance. Sums to 100 over all seats where there are no others",
            bounds=ANY_NUMBER,
            blank="the code's seats are the same in every draw",
        ),
        yes_no_column(
            "too_close",
            f"Whether no party is likely to win the seat: none has a chance of {NAMED_LEADER_FROM:g}",
        ),
    ),
)

SEATS_VOTES = TableSchema(
    "public/seats_votes.csv",
    "code, what and votes",
    (
        CODE,
        LEVEL,
        Column(
            "what",
            ColumnType.TEXT,
            "–",
            "`curve`: the code's seats on polling day if it had this share of the vote. `responsiveness`: "
            "the seats that one percentage point of the vote more brings, about the vote it is expected to "
            "have. `lead_at_equal_votes`: its seats less those of `against` if both had equal votes. Votes "
            "are multiplied by one factor in every seat, others make room (King & Browning 1987; Gelman & "
            "King 1994)",
            allowed=tuple(SeatsVotes),
        ),
        Column(
            "against",
            ColumnType.CODE,
            "–",
            "The other party or alliance",
            blank="any `what` but `lead_at_equal_votes`",
        ),
        number_column("votes", "percent of the vote", "Share of the whole vote; a mean but for the curve"),
        *quantile_columns("seats", of="the number", bounds=ANY_NUMBER, decimals=2, whole=False),
    ),
)
