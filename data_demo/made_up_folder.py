"""An invented election written as a contest folder, the way a desk would keep it."""

from __future__ import annotations

import json
from pathlib import Path

import pandas as pd

from data_demo.made_up_election import MadeUpElection
from data_demo.made_up_scenery import MadeUpAlliance, MadeUpJolt, MadeUpParty, MadeUpRegion, Scenery


def write_contest_folder(election: MadeUpElection, folder: Path) -> None:
    """Write contest, register, results and (in ``truth/``) the truth; the folder may exist.

    ``result_counted.csv`` and ``past_errors.csv`` are written where the election has them.
    """
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "contest.toml").write_text(contest_text(election.scenery), encoding="utf-8")
    write_table(election.polls.dropna(axis="columns", how="all"), folder / "polls.csv")
    write_table(_slate_only(election.result_last, scenery=election.scenery), folder / "result_last.csv")
    write_table(_slate_only(election.outcome, scenery=election.scenery), folder / "result_outcome.csv")
    if not election.counted.empty:
        counted = _slate_only(election.counted, scenery=election.scenery)
        write_table(counted, folder / "result_counted.csv")
    if not election.past_errors.empty:
        write_table(election.past_errors, folder / "past_errors.csv")
    (folder / "truth").mkdir(exist_ok=True)
    first_day = str(election.scenery.first_fieldwork)
    for name, table in election.truth.tables().items():
        # Before the first poll the path is of no use to anyone, and most of the file.
        kept = table[table["date"] >= first_day] if "date" in table else table
        if table.empty:
            continue
        write_table(kept, folder / "truth" / f"{name}.csv")


def _slate_only(votes: pd.DataFrame, *, scenery: Scenery) -> pd.DataFrame:
    """Blank the cells of parties where they do not stand: nobody could vote for them there."""
    table = votes.copy()
    for party in scenery.parties:
        if party.regions is not None:
            table[party.code] = table[party.code].astype("Int64").where(table["region"].isin(party.regions))
    return table


def write_table(table: pd.DataFrame, path: Path) -> None:
    """Write CSV with blanks for what is missing and at most six significant digits."""
    table.to_csv(path, index=False, encoding="utf-8", lineterminator="\n", float_format="%.6g")


def contest_text(scenery: Scenery) -> str:
    """Text of ``contest.toml``, with comments for the person who edits it."""
    blocks = [
        "# The contest: who stands where, how votes become seats, and when nothing may be published.\n"
        "# Codes are the column names of polls.csv and the result files.\n"
        f"title = {_text(scenery.title)}\n"
        f"polling_day = {scenery.polling_day}\n",
        '# Parties, in the order of tables and charts. "Others" (OTH) need no entry.\n'
        + "\n".join(_party(p) for p in scenery.parties),
    ]
    if scenery.alliances:
        blocks.append(
            "# Alliances. An open end (no `from`, no `until`) means always.\n"
            + "\n".join(_alliance(a) for a in scenery.alliances)
        )
    blocks += [
        "# Regions. Their weights come from the turnout in the last result.\n"
        + "\n".join(_region(r) for r in scenery.regions),
    ]
    if scenery.jolts:
        blocks.append(
            "# Days on which opinion may have jumped: older polls say less after such a day. Which way it\n"
            "# went is for the polls to show. `weeks`: how many weeks' usual movement may lie in that day.\n"
            + "\n".join(_jolt(j) for j in scenery.jolts)
        )
    blocks += [
        f'[last_result]\ndate = {scenery.last_election}\nfile = "result_last.csv"\n',
        "[counting]\n"
        'rule = "plurality"    # the most votes in a seat win it\n'
        f"seats = {scenery.seat_count}\n"
        f"majority = {scenery.seat_count // 2 + 1}\n",
    ]
    return "\n".join(blocks)


def _party(party: MadeUpParty) -> str:
    lines = ["[[party]]", f"code = {_text(party.code)}", f"name = {_text(party.name)}"]
    if party.colour is not None:
        lines.append(f"colour = {_text(party.colour)}")
    if party.regions is not None:
        lines.append(f"regions = [{', '.join(_text(r) for r in party.regions)}]    # stands only there")
    if party.inherits:
        shares = ", ".join(f"{code} = {rate}" for code, rate in party.inherits)
        lines.append(f"inherits = {{ {shares} }}    # takes this share of a dissolved party's last votes")
    if party.is_new:
        lines.append("# founded since the last election: no last votes, so its start is estimated freely")
    return "\n".join(lines) + "\n"


def _region(region: MadeUpRegion) -> str:
    lines = ["[[region]]", f"code = {_text(region.code)}", f"name = {_text(region.name)}"]
    if region.polling_day is not None:
        lines.append(
            f"polling_day = {region.polling_day}    # votes before the others; its support stands still then"
        )
    if region.counted is not None:
        lines.append(
            f"counted = {region.counted}    # its count came out that day: result_counted.csv, taken as it is"
        )
    return "\n".join(lines) + "\n"


def _jolt(jolt: MadeUpJolt) -> str:
    return f"[[jolt]]\ndate = {jolt.day}\nweeks = {jolt.weeks:g}\nname = {_text(jolt.name)}\n"


def _alliance(alliance: MadeUpAlliance) -> str:
    lines = ["[[alliance]]", f"code = {_text(alliance.code)}", f"name = {_text(alliance.name)}"]
    if alliance.colour is not None:
        lines.append(f"colour = {_text(alliance.colour)}")
    lines.append(f"members = [{', '.join(_text(m) for m in alliance.members)}]")
    if alliance.from_ is not None:
        lines.append(f"from = {alliance.from_}    # from this day polls may give one figure for all members")
    return "\n".join(lines) + "\n"


def _text(value: str) -> str:
    return json.dumps(value, ensure_ascii=False)
