"""What a violation breaks: the same elections with it and without it, side by side."""

from __future__ import annotations

import numpy as np
import pandas as pd

from aggregator.studies.coverage import groups_of, ratio_interval
from aggregator.studies.judged_elections import JudgedElections
from aggregator.studies.noticed import summarise_noticed

COVERAGE = 90
DAMAGE_COLUMNS = (
    *("group", "elections", "inside_honest", "inside_violated", "crps_ratio", "low", "high"),
    *("error_ratio", "width_ratio"),
)


def summarise_damage(
    violated: JudgedElections, honest: JudgedElections, *, rng: np.random.Generator
) -> pd.DataFrame:
    """Coverage, CRPS, error and width with a violation, over those without it.

    Parameters
    ----------
    violated, honest
        The same elections, from the same seeds.
    rng
        For the bootstrap, which draws elections in their pairs.

    Returns
    -------
    pandas.DataFrame
        Columns ``DAMAGE_COLUMNS``. ``inside_…``: percent of 90 % intervals that hold the truth.
        ``crps_ratio``: mean CRPS with the violation over that without, with its 95 % interval ``low`` to
        ``high``. ``error_ratio``, ``width_ratio``: the same of mean absolute errors and of widths of 90 %
        intervals.
    """
    rows = []
    groups, pairs = groups_of(violated.judged), groups_of(honest.judged)
    for name in groups:
        if name not in pairs:
            continue
        bad, good = _by_election(groups[name]), _by_election(pairs[name])
        both = bad.index.intersection(good.index)
        bad, good = bad.loc[both], good.loc[both]
        low, high = ratio_interval(bad["crps"].to_numpy(), good["crps"].to_numpy(), rng=rng)
        rows.append(
            (
                name,
                len(both),
                100 * good["inside"].sum() / good["numbers"].sum(),
                100 * bad["inside"].sum() / bad["numbers"].sum(),
                bad["crps"].sum() / good["crps"].sum(),
                low,
                high,
                bad["error"].sum() / good["error"].sum(),
                bad["width"].sum() / good["width"].sum(),
            )
        )
    return pd.DataFrame(rows, columns=list(DAMAGE_COLUMNS))


def summarise_alarms(violated: JudgedElections, honest: JudgedElections) -> pd.DataFrame:
    """What the program says about elections with a violation and without: part of the elections, percent.

    Returns
    -------
    pandas.DataFrame
        Columns ``kind``, ``name``, ``honest``, ``violated`` (percent of elections), ``count_honest``,
        ``count_violated`` (mean number), the largest difference first.
    """
    said = {
        name: summarise_noticed(study.noticed, elections=len(study.fits))
        .set_index(["kind", "name"])
        .add_suffix(f"_{name}")
        for name, study in (("honest", honest), ("violated", violated))
    }
    both = said["honest"].join(said["violated"], how="outer").fillna(0.0)
    table = pd.DataFrame(
        {
            "honest": both["elections_honest"],
            "violated": both["elections_violated"],
            "count_honest": both["mean_count_honest"],
            "count_violated": both["mean_count_violated"],
        }
    )
    order = (table["violated"] - table["honest"]).sort_values(ascending=False, kind="stable").index
    return table.loc[order].reset_index()


def _by_election(group: pd.DataFrame) -> pd.DataFrame:
    """Sums over the numbers of each election."""
    return (
        group.assign(error=(group["estimate"] - group["truth"]).abs(), numbers=1.0)
        .groupby("election")
        .agg(
            crps=("crps", "sum"),
            error=("error", "sum"),
            width=(f"width_{COVERAGE}", "sum"),
            inside=(f"inside_{COVERAGE}", "sum"),
            numbers=("numbers", "sum"),
        )
        .astype(float)
    )
