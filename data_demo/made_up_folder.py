"""An invented election written as a contest folder, the way a desk would keep it."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from data_demo.made_up_contest_text import contest_text
from data_demo.made_up_counting import transfer_table
from data_demo.made_up_election import MadeUpElection
from data_demo.made_up_scenery import Scenery


def write_contest_folder(election: MadeUpElection, folder: Path) -> None:
    """Write contest, register, results and (in ``truth/``) the truth; the folder may exist.

    ``result_counted.csv``, ``result_before_last.csv``, ``transfers.csv`` and ``past_errors.csv`` are written
    where the election has them.
    """
    scenery = election.scenery
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "contest.toml").write_text(contest_text(scenery), encoding="utf-8")
    write_table(election.polls.dropna(axis="columns", how="all"), folder / "polls.csv")
    results = {
        "result_last": election.result_last,
        "result_before_last": election.before_last,
        "result_counted": election.counted,
        "result_outcome": election.outcome,
    }
    for name, votes in results.items():
        if not votes.empty:
            write_table(_as_printed(votes, scenery=scenery), folder / f"{name}.csv")
    if scenery.counting is not None:
        write_table(transfer_table(scenery.counting), folder / "transfers.csv")
    if not election.past_errors.empty:
        write_table(election.past_errors, folder / "past_errors.csv")
    (folder / "truth").mkdir(exist_ok=True)
    first_day = str(scenery.first_fieldwork)
    for name, table in election.truth.tables().items():
        # Before the first poll the path is of no use to anyone, and most of the file.
        kept = table[table["date"] >= first_day] if "date" in table else table
        if table.empty:
            continue
        write_table(kept, folder / "truth" / f"{name}.csv")


def _as_printed(votes: pd.DataFrame, *, scenery: Scenery) -> pd.DataFrame:
    """Blank the cells of parties where they do not stand, and tell members and cluster where any has them."""
    table = votes.copy()
    for party in scenery.parties:
        if party.regions is not None:
            table[party.code] = table[party.code].astype("Int64").where(table["region"].isin(party.regions))
    after = list(table).index("region") + 1
    for column, cells in _beside_the_votes(scenery).items():
        if cells.nunique() > 1:
            table.insert(after, column, cells.loc[table["name"]].to_numpy())
            after += 1
    return table


def _beside_the_votes(scenery: Scenery) -> pd.DataFrame:
    """Members that each seat elects and its cluster, by the seat's name: columns seats, cluster."""
    rows = [
        (name, members, cluster)
        for region in scenery.regions
        for name, members, cluster in zip(
            region.seat_names,
            region.members_by_seat,
            region.clusters or [""] * len(region.seat_names),
            strict=True,
        )
    ]
    return pd.DataFrame(rows, columns=["name", "seats", "cluster"]).set_index("name")


def write_table(table: pd.DataFrame, path: Path) -> None:
    """Write CSV with blanks for what is missing and at most six significant digits."""
    table.to_csv(path, index=False, encoding="utf-8", lineterminator="\n", float_format="%.6g")
