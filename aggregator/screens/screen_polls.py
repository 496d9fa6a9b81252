"""The room's one door: checked inputs in, a table of questions out.

Nothing here is evidence of fault. Every screen compares a register with what honest work would usually leave,
names the innocent explanations, and asks. The table stays at the desk; it moves no estimate.
"""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.screens.habits import ask_about_sample_sizes, ask_about_timing
from aggregator.screens.pooled_samples import ask_about_pooled_samples
from aggregator.screens.questions import questions_table
from aggregator.screens.register_series import poll_table
from aggregator.screens.repeated_figures import ask_about_repeated_figures
from aggregator.screens.spread import ExpectedFigures, ask_about_spread


def screen_polls(
    inputs: DeskInputs, *, expected: ExpectedFigures | None = None, rng: np.random.Generator
) -> pd.DataFrame:
    """Look for polls whose figures deserve a question.

    Parameters
    ----------
    inputs
        The desk's checked files; only polls in the fit are looked at.
    expected
        What a fit expects each row to print. Without it the spread of a house's figures is taken about their
        mean within windows of six weeks.
    rng
        Draws honest figures to hold rare spreads against.

    Returns
    -------
    pandas.DataFrame
        One row per question: ``screen``, ``house`` (blank: all), ``code`` (blank: all, or none in
        particular), ``polls`` (identifiers joined by "; "), ``found``, ``usual``, ``question``.
    """
    polls, regions = inputs.polls, inputs.contest.region_codes
    codes = [code for code in inputs.contest.column_codes if code in polls and polls[code].notna().any()]
    table = poll_table(polls, regions=regions)
    return questions_table(
        [
            *ask_about_spread(polls, codes=codes, regions=regions, expected=expected, rng=rng),
            *ask_about_repeated_figures(polls, codes=codes),
            *ask_about_pooled_samples(table),
            *ask_about_sample_sizes(table),
            *ask_about_timing(table),
        ]
    )
