"""Make the demo contest ``data_demo/lake_provinces`` again, byte for byte.

Run from the top of the project: ``python -m data_demo.make_lake_provinces``.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import date, timedelta
from pathlib import Path

import pandas as pd

from data_demo.lake_provinces_scenery import LAKE_PROVINCES
from data_demo.made_up_contest_text import contest_text
from data_demo.made_up_election import MadeUpElection, simulate_scenery
from data_demo.made_up_folder import write_contest_folder

SEED = 1288
"""Chosen for a close race: an alliance near the line, no party near it alone."""

HEADER = """\
# An invented country. Its polls and results were simulated; what was true all along is in truth/.
#
# Notes of the desk on polls.csv and the files beside this one
#
# method      Tarvick Surveys only called people until the end of June 2025; since then part of its sample
#             comes from its own web panel. The label in `method` changed with that, so that it is compared
#             anew, and a jump of its figures is not read as a jump of opinion.
# mode        Online, telephone, face to face, mixed. Marrimund uses two of them.
# population  Most houses ask voters, whom the result is about. Veldane and Marrimund ask adults, Ostrelle
#             people on the electoral roll: their figures may differ for that reason alone.
# alliances   Marrimund and Brislow often ask about a pact as one choice (columns LAKE, HILL). People may
#             answer that otherwise than they answer about its members.
# effective   Veldane prints the effective size of its samples beside the number of interviews.
# region      Some polls are of one region. Pelloran breaks some national polls down by all regions, Umbrick
#             by three: there the national row counts, and the three are kept for reference.
# tracking    PEL-T01 to PEL-T12: Pelloran interviews every day and prints the last five days, every other
#             day, for Mere Morning. Days that two windows share count once; each overlap is reported.
# undecided   Set aside, with the chance that in the end they break otherwise than those who chose.
#
# result_counted.csv  The Hundred Isles, which have voted already: votes by seat, as counted.
# past_errors.csv     Our average of the last polls before five elections, and what came out: how far all
#                     houses together have been wrong.

"""

RELEASE = """
[release]
publisher = "The Lakeshore Courier, data desk"

# The law forbids publishing polls in this window (both days included): a release made for a day inside
# it is marked "not for publication". Set what the law that applies to you says, or leave it out.
[[release.silence]]
from = 2026-05-10
until = 2026-05-17
time_zone = "UTC"
law = "Lake Provinces Election Act, section 41"

# The same law, for the region that votes two weeks early.
[[release.silence]]
from = 2026-04-26
until = 2026-05-03
time_zone = "UTC"
regions = ["ISLE"]
law = "Lake Provinces Election Act, section 41"

# The model's settings may be overridden here; left out, the defaults hold.
# [model]
# shared_lean = true             # an error all houses share, which polls alone cannot show
# shared_lean_points = 2.5       # its sd for a party of 40 %, where past_errors.csv does not say
# shared_lean_correlation = 0.33 # between the last election's and this one's
# ramp = true                    # opinion may move faster or slower in the last 60 days
# target_population = "voters"   # whom the result is about: other populations are measured against them
"""


def build_lake_provinces() -> MadeUpElection:
    """Simulate the Lake Provinces and let the register live through what registers live through."""
    election = simulate_scenery(LAKE_PROVINCES, seed=SEED)
    return replace(election, polls=with_register_events(election.polls))


def write_lake_provinces(folder: Path) -> None:
    """Write the demo contest folder."""
    election = build_lake_provinces()
    write_contest_folder(election, folder)
    text = HEADER + contest_text(election.scenery) + RELEASE
    (folder / "contest.toml").write_text(text, encoding="utf-8")


def with_register_events(polls: pd.DataFrame) -> pd.DataFrame:
    """Add a correction, a withdrawal, a poll left out in the open and a hypothetical question."""
    table = polls.astype(
        {"replaces": object, "status_date": object, "use": object, "why_not": object, "note": object}
    )
    table = _corrected(table)
    table = _withdrawn(table)
    table = _hypothetical(table)
    table = _left_out(table)
    return table.sort_values(["published", "poll"], kind="stable", ignore_index=True)


def _national(table: pd.DataFrame, *, house: str, after: date) -> int:
    """Row of a house's first poll published after a day that is one row for the whole country."""
    rows = table["house"].eq(house) & table["region"].eq("") & table["published"].gt(str(after))
    rows &= ~table["poll"].duplicated(keep=False)
    return int(rows.idxmax())


def _corrected(table: pd.DataFrame) -> pd.DataFrame:
    """Two columns were swapped at first publication; a week later the right row replaced that one."""
    row = _national(table, house="Pelloran Panel", after=date(2025, 9, 1))
    right = table.loc[row].copy()
    published = date.fromisoformat(str(right["published"]))
    fixed_on = str(published + timedelta(days=6))
    table.loc[row, ["WS", "CC"]] = right[["CC", "WS"]].to_numpy()
    right["replaces"], right["poll"] = right["poll"], f"{right['poll']}b"
    right["status_date"], right["source"] = fixed_on, f"correction {fixed_on}"
    right["note"] = "Watershed and Civic Compact were swapped in the first release."
    return pd.concat([table, right.to_frame().T], ignore_index=True).astype(table.dtypes.to_dict())


def _withdrawn(table: pd.DataFrame) -> pd.DataFrame:
    row = _national(table, house="Marrimund", after=date(2025, 12, 1))
    published = date.fromisoformat(str(table.at[row, "published"]))
    table.loc[row, ["status", "status_date"]] = ["withdrawn", str(published + timedelta(days=9))]
    table.loc[row, "note"] = "Withdrawn by the house: part of the sample was drawn twice."
    return table


def _hypothetical(table: pd.DataFrame) -> pd.DataFrame:
    row = _national(table, house="Dovrenna", after=date(2026, 1, 15))
    extra = table.loc[row].copy()
    extra["question"] = "hypothetical"
    extra[["HU", "UP", "CC"]] = [extra["HU"] - 2.3, extra["UP"] - 0.9, extra["CC"] + 3.0]
    extra["note"] = "If the mayor of Fenlosund led Civic Compact."
    return pd.concat([table, extra.to_frame().T], ignore_index=True).astype(table.dtypes.to_dict())


def _left_out(table: pd.DataFrame) -> pd.DataFrame:
    votes = {"HU": 19.0, "UP": 44.0, "CC": 9.0, "TL": 15.0, "WS": 4.0, "OL": 5.0, "NL": 3.0, "SH": 1.0}
    row = {
        "poll": "UGR-001",
        "house": "Upland Gazette reader vote",
        "sponsor": "Upland Gazette",
        "start": "2026-02-10",
        "end": "2026-02-15",
        "published": "2026-02-17",
        "question": "vote",
        "region": "",
        "sample": 9412,
        "mode": "online",
        "population": "adults",
        "status": "final",
        "use": "no",
        "why_not": "Readers took part by themselves: no sample was drawn.",
        "source": "release 2026-02-17",
        **votes,
    }
    return pd.concat([table, pd.DataFrame([row])], ignore_index=True)


if __name__ == "__main__":
    write_lake_provinces(Path(__file__).parent / "lake_provinces")
