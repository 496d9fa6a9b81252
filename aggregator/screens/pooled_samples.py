"""Samples that may be several samples put together: long windows, and polls that contain other polls."""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.screens.questions import Question, Screen, joined_polls

# More than four weeks mix opinion of different times (common practice).
LONGEST_WINDOW_DAYS = 28
# A poll that holds this many others of its house, and as many people as they do together, may be their sum.
# One is not enough: a house that always asks 1,000 has a poll of 1,000 inside every longer one.
FEWEST_CONTAINED = 2
# Weighted bases are rounded, and a few interviews are dropped when samples are joined.
SUM_SLACK = 0.03


def ask_about_pooled_samples(table: pd.DataFrame) -> list[Question]:
    """Ask where a sample may be several samples put together.

    Parameters
    ----------
    table
        One row per poll, as ``poll_table`` builds it.
    """
    return [*_long_windows(table), *_sums(table)]


def _long_windows(table: pd.DataFrame) -> list[Question]:
    questions = []
    for house, polls in table[table["days"] > LONGEST_WINDOW_DAYS].groupby("house", sort=False):
        others = table.loc[(table["house"] == house) & ~table["poll"].isin(polls["poll"]), "days"]
        usual = f"{others.median():.0f} days for the house's other polls" if len(others) else "not known"
        questions.append(
            Question(
                Screen.POOLED_SAMPLE, str(house), "", joined_polls(polls["poll"]),
                f"fieldwork of {polls['days'].min()} to {polls['days'].max()} days in {len(polls)} poll(s)",
                usual,
                "Were these interviews pooled from several waves over the window, and if so, how many fell "
                "into each week? A slow method (mail, visits) or a wrong month has the same look; the poll "
                "is read as even over its window.",
            )
        )  # fmt: skip
    return questions


def _sums(table: pd.DataFrame) -> list[Question]:
    questions = []
    for house, polls in table.groupby("house", sort=False):
        start, end, days = (polls[name].to_numpy() for name in ("start", "end", "days"))
        regions = polls["regions"].to_numpy()
        # A shorter window holds no two windows of other days.
        for place in np.flatnonzero(days > FEWEST_CONTAINED):
            within = (start >= start[place]) & (end <= end[place]) & (days < days[place])
            if within.sum() < FEWEST_CONTAINED:
                continue
            within &= np.array([where <= regions[place] for where in regions])
            poll, inside = polls.iloc[place], polls[within]
            together = float(inside["sample"].sum())
            if len(inside) < FEWEST_CONTAINED or abs(poll["sample"] - together) > SUM_SLACK * together:
                continue
            questions.append(
                Question(
                    Screen.POOLED_SAMPLE, str(house), "", joined_polls([poll["poll"], *inside["poll"]]),
                    f"{poll['sample']:.0f} respondents; {len(inside)} polls of the house lie within its "
                    f"window and have {together:.0f} together",
                    "interviews of its own",
                    f"Is {poll['poll']} made of the interviews of the other polls? Then they would be "
                    "counted twice: set use = no for it, or for them. If the interviews are its own, nothing "
                    "needs to be done.",
                )
            )  # fmt: skip
    return questions
