"""What the program itself says about a register and its fit, and whether any of it points at a violation.

Everything here also speaks up about honest elections now and then, so a count means nothing alone: it is
held against that of the same elections without the violation.
"""

from __future__ import annotations

from collections import Counter

import numpy as np
import pandas as pd

from aggregator.inputs.reading_rules import Rule
from aggregator.replays.replayed_fit import ReplayedFit, has_passed
from aggregator.screens.screen_polls import screen_polls
from aggregator.studies.invented_elections import InventedElection

NOTICED_COLUMNS = ("election", "kind", "name", "count")


def list_noticed(election: InventedElection, fit: ReplayedFit, *, rng: np.random.Generator) -> pd.DataFrame:
    """List what was said about one election.

    Parameters
    ----------
    rng
        For the screens.

    Returns
    -------
    pandas.DataFrame
        Columns ``NOTICED_COLUMNS``: ``kind`` is "warning" (of the reading, by rule), "screen", "predictive"
        (figures unlike what the fit would have expected, of a house or of all together), or "check" (of the
        fit); ``count`` how often.
    """
    screens = screen_polls(election.inputs, rng=rng)
    said = [("warning", _rule_in_words(problem.rule)) for problem in election.inputs.warnings]
    said += [("screen", str(name)) for name in screens["screen"]]
    counts = Counter(said)
    out = [house for house in fit.facts["stands_out"] if house]
    if out:
        counts["predictive", "a house stands out"] = len(out)
    if "" in fit.facts["stands_out"]:
        counts["predictive", "all houses together stand out"] = 1
    if not has_passed(fit):
        counts["check", "of the fit failed"] = 1
    rows = [(election.seed, kind, name, count) for (kind, name), count in counts.items()]
    return pd.DataFrame(rows, columns=list(NOTICED_COLUMNS))


def summarise_noticed(noticed: pd.DataFrame, *, elections: int) -> pd.DataFrame:
    """Part of the elections that each thing was said about.

    Returns
    -------
    pandas.DataFrame
        Columns ``kind``, ``name``, ``elections`` (percent), ``mean_count`` over all elections.
    """
    grouped = noticed.groupby(["kind", "name"], sort=True)["count"]
    table = pd.DataFrame(
        {"elections": 100 * grouped.size() / elections, "mean_count": grouped.sum() / elections}
    )
    return table.reset_index()


def _rule_in_words(number: str) -> str:
    """Name a rule of reading by its number and subject, such as "R35 windows overlap"."""
    return f"{number} {Rule(number).name.lower().replace('_', ' ')}"
