"""Published figures against what the model expected, in words: for the note, and for the desk alone."""

from __future__ import annotations

import pandas as pd

from aggregator.release.rounding import whole_text

NO_NOISE = 1.0
"""Root mean square distance of figures whose noise is as the model has it."""


def predictive_sentences(table: pd.DataFrame | None) -> list[str]:
    """Say how many figures lie where they should; no house is named.

    Parameters
    ----------
    table
        Rows of the schema ``PREDICTIVE``; None where it was not worked out.
    """
    if table is None:
        return []
    overall = table[(table["house"] == "") & (table["code"] == "")].iloc[0]
    houses = table[(table["code"] == "") & (table["house"] != "")]
    count = int((houses["stands_out"] == "yes").sum())
    return [
        f"Of {whole_text(overall['figures'])} published figures {overall['inside_90']:.0f} % lie inside the "
        "90 % interval, and "
        f"{overall['inside_50']:.0f} % inside the 50 % interval, of what the model expected of them without "
        "their own poll.",
        "No house stands out as noisier, or less noisy, than the model has it."
        if count == 0
        else f"{count} of {len(houses)} houses {'stands' if count == 1 else 'stand'} out as noisier, or less "
        "noisy, than the model has it.",
    ]


def predictive_questions(table: pd.DataFrame | None) -> list[str]:
    """Ask about every house that stands out; these questions stay at the desk.

    Parameters
    ----------
    table
        As for `predictive_sentences`.
    """
    if table is None:
        return []
    rows = table[(table["code"] == "") & (table["stands_out"] == "yes")].to_dict("records")
    return [_question(row["house"], row) for row in rows]


def _question(house: str, row: dict) -> str:
    found = (
        f"{house}: {row['inside_90']:.0f} % of its {whole_text(row['figures'])} figures lie inside the 90 % "
        f"interval of what the model expected without their poll, and they lie {row['spread_z']:.1f} times "
        "as far from it as usual."
    )
    if row["spread_z"] > NO_NOISE:
        return (
            f"{found} Has the house changed its method, mode or weighting (a label in `method` would say "
            "so), are rows of another question among its polls, or is a figure in the wrong column?"
        )
    return (
        f"{found} Does the house smooth its figures over several polls, do its waves overlap (are start and "
        "end of each right?), or are figures of one poll entered twice?"
    )
