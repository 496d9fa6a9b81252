"""What the tables of leans hold: houses by way of working, modes, populations, alliances asked as one."""

from __future__ import annotations

from aggregator.release.table_columns import (
    ANY_COUNT,
    CODE,
    PROBABILITY,
    Column,
    ColumnType,
    TableSchema,
    number_column,
    points_column,
    typed_column,
    whole_column,
)
from aggregator.release.table_words import LeanKind

HOUSES = TableSchema(
    "public/houses.csv",
    "house, method and code",
    (
        typed_column("house", "The polling organisation"),
        typed_column(
            "method", "The house's label for its way of working", blank="one way of working, or none given"
        ),
        typed_column("mode", "How it usually asked people while it worked that way", blank="not given"),
        typed_column("population", "Whom it usually asked", blank="not given"),
        CODE,
        points_column(
            "lean",
            "What the house prints minus what the average of the houses would print, its usual mode and "
            "population included (posterior mean). A difference, not an error",
        ),
        points_column("q05", "The lean is below this with chance 5 %"),
        points_column("q95", "The lean is below this with chance 95 %"),
        points_column(
            "own_lean",
            "The part of the lean that is the house's own, without what its mode and population do; "
            "`mode_leans.csv` says how far the polls can tell them apart",
        ),
        points_column("own_q05", "The own lean is below this with chance 5 %"),
        points_column("own_q95", "The own lean is below this with chance 95 %"),
        whole_column("polls", "polls", "Polls of the house in the fit, taken while it worked that way"),
        number_column(
            "design_effect",
            "ratio",
            "Posterior mean of the variance of a poll of the house's usual size, over that of a simple "
            "random sample of that size",
            bounds=ANY_COUNT,
        ),
        whole_column("usual_sample", "respondents", "The house's usual sample size"),
    ),
)

MODE_LEANS = TableSchema(
    "public/mode_leans.csv",
    "kind, label and code; no rows where all polls are alike in this",
    (
        Column(
            "kind",
            ColumnType.TEXT,
            "–",
            "`mode`: how people were asked, against the average of the houses. `population`: whom, against "
            "the population of the contest. `asked_together`: an alliance asked about as one, against its "
            "members asked about one by one",
            allowed=tuple(LeanKind),
        ),
        typed_column("label", "The mode, the population or the alliance's code"),
        CODE,
        points_column("lean", "What asking that way adds to the figure (posterior mean)"),
        points_column("q05", "The lean is below this with chance 5 %"),
        points_column("q95", "The lean is below this with chance 95 %"),
        whole_column("houses", "houses", "Houses that ask that way", blank="`asked_together`"),
        whole_column("polls", "polls", "Polls that asked for the alliance as one", blank="any other kind"),
        number_column(
            "learned",
            "0 to 1",
            "How much of what was not known the polls have told: one minus the posterior variance over the "
            "prior's. Near 0 the polls cannot tell this lean from those of the houses",
            bounds=PROBABILITY,
        ),
    ),
)
