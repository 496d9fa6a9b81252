"""What the table of screens holds: questions that polls raise, for the desk alone."""

from __future__ import annotations

from aggregator.release.table_columns import Column, ColumnType, TableSchema, typed_column
from aggregator.screens.questions import Screen

SCREENS = TableSchema(
    "desk/screens.csv",
    "question that polls raise",
    (
        Column(
            "screen",
            ColumnType.TEXT,
            "–",
            "Which screen asks. `spread`: figures nearer to each other than sampling alone would leave them. "
            "`repeated_figures`: the same figures twice. `pooled_sample`: a sample that may be several put "
            "together. `sample_size`: unlike the house's habit. `timing`: window, publication and sample "
            "that do not fit each other",
            allowed=tuple(Screen),
        ),
        typed_column("house", "The house to ask, several joined by `; `", blank="all houses together"),
        Column(
            "code",
            ColumnType.CODE,
            "–",
            "Party or alliance of the figures, as in `contest.toml`",
            blank="all codes together, or the question is not about figures",
        ),
        typed_column("polls", "Identifiers of the polls it is about, joined by `; `"),
        Column("found", ColumnType.TEXT, "–", "What was found"),
        Column("usual", ColumnType.TEXT, "–", "What would have been usual"),
        Column(
            "question",
            ColumnType.TEXT,
            "–",
            "What to ask the house, or to look up at the desk, with the innocent explanations. Never a "
            "finding of fault",
        ),
    ),
)
