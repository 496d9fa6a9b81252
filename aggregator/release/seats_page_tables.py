"""The page's tables about seats: by code, together, seat by seat, and against votes."""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from typing import Any

import pandas as pd

from aggregator.release.combination_words import combination_text, listed
from aggregator.release.contents import ReleaseContents
from aggregator.release.likelihood_words import NAMED_LEADER_FROM
from aggregator.release.page_tables import STATEMENTS, PageTable, two_statements, whole_interval
from aggregator.release.rounding import chance_text, share_text, whole_text
from aggregator.release.seats_rows import (
    codes_nearest_the_line,
    deciding_seats_of,
    lead_rows,
    likeliest_combinations,
    seat_name,
    share_for_majority,
    slope_row,
)
from aggregator.release.table_rows import last_row

CLOSEST_SEATS = 12
COMBINATIONS_SHOWN = 12
CODES_SHOWN = 3
SEATS_SHOWN = 6
PERCENT = 100.0


def seats_table(contents: ReleaseContents) -> PageTable | None:
    """Set out the seats of every code; None where nothing is counted in seats."""
    seats, chamber = contents.tables.seats, contents.chamber
    if seats is None or chamber is None:
        return None
    lists = contents.list_seats
    body = [
        (
            code.name,
            *(_seats_over_interval(last_row(seats, code=code.code, kind=kind)) for kind in STATEMENTS),
            *(() if lists is None else (whole_text(lists[code.code]),)),
        )
        for code in contents.codes
    ]
    return PageTable(
        f"Seats. {chamber.sentence} Mean, and 90 % interval below it. An alliance is the sum of its members.",
        (*two_statements(contents), *(() if lists is None else ("Of these from lists, on polling day",))),
        tuple(body),
    )


def combinations_table(contents: ReleaseContents) -> PageTable | None:
    """Set out who reaches the majority line together; None where nobody can, or nothing is counted."""
    table, chamber = contents.tables.combinations, contents.chamber
    if table is None or chamber is None:
        return None
    rows = likeliest_combinations(table, most=COMBINATIONS_SHOWN)
    if rows.empty:
        return None
    body = [
        (
            combination_text(row["combination"], contents.names)
            + (f"\n{contents.names[row['alliance']]}" if row["alliance"] else ""),
            f"{whole_text(row['mean'])}\n{whole_interval(row['q05'], row['q95'])}",
            f"{chance_text(row['chance'])}\n{row['likelihood']}",
        )
        for row in rows.to_dict("records")
    ]
    return PageTable(
        f"Who reaches the majority line on polling day. {chamber.sentence} Alliances, and the combinations "
        "that most often need every one of their parties; all are in combinations.csv. Arithmetic only: "
        "nothing is said of who would work with whom.",
        ("Parties", "Seats", "Chance"),
        tuple(body),
    )


def deciding_seats_table(contents: ReleaseContents) -> PageTable | None:
    """Set out the seats that most often decide a majority; None where no seat can."""
    table, chamber = contents.tables.deciding_seats, contents.chamber
    if table is None or table.empty or chamber is None:
        return None
    codes = codes_nearest_the_line(contents.tables, chamber=chamber, most=CODES_SHOWN)
    several = len(codes) > 1
    body = [
        (
            seat_name(row),
            contents.region_names.get(row["region"], ""),
            *([contents.names[code]] if several else []),
            share_text(PERCENT * row["decides"]),
            chance_text(row["chance"]),
            "–" if pd.isna(row["carries"]) else share_text(row["carries"]),
            row["too_close"],
        )
        for code in codes
        for row in deciding_seats_of(table, code=code, most=SEATS_SHOWN).to_dict("records")
    ]
    whom = "the parties and alliances nearest to the line" if several else contents.names[codes[0]]
    columns = ("Seat", "Region", *(["For a majority of"] if several else []))
    return PageTable(
        f"The seats that most often decide whether there is a majority for {whom}. Decides: chance that, in "
        "the order of the lead, this seat is the one at the line. Carries: part of the variance of all their "
        "seats that comes with this one. Too close: nobody is likely to win it."
        + _close_together(table, codes, contents.names),
        (*columns, "Decides", "Wins it", "Carries", "Too close"),
        tuple(body),
        words=frozenset({*range(len(columns)), len(columns) + 3}),
    )


def _close_together(table: pd.DataFrame, codes: Sequence[str], names: Mapping[str, str]) -> str:
    """Say what the seats that are too close to call carry together; empty where there are none."""
    close = table[(table["too_close"] == "yes") & table["carries"].notna()]
    told = [
        f"{_seats_text(int((close['code'] == code).sum()))} too close to call carry "
        f"{share_text(close.loc[close['code'] == code, 'carries'].sum())} of the variance of {names[code]}"
        for code in codes
        if (close["code"] == code).any()
    ]
    return f" Together {listed(told)}." if told else ""


def _seats_text(number: int) -> str:
    return "the one seat" if number == 1 else f"the {whole_text(number)} seats"


def closest_seats_table(contents: ReleaseContents) -> PageTable | None:
    """Set out the seats whose likeliest winner is least sure; None without seats that elect one member."""
    table = contents.tables.seat_chances
    table = None if table is None else table[table["members"] == 1]
    if table is None or table.empty:
        return None
    ordered = table.sort_values("chance", ascending=False, kind="stable")
    place = ordered.groupby("seat", sort=False).cumcount()
    second = {row["seat"]: row for row in ordered[place == 1].to_dict("records")}
    first = ordered[place == 0].sort_values("chance", kind="stable")
    body = [
        (
            seat_name(row),
            contents.region_names.get(row["region"], ""),
            _chance_of(row, contents),
            _chance_of(second[row["seat"]], contents) if row["seat"] in second else "–",
        )
        for row in first.head(CLOSEST_SEATS).to_dict("records")
    ]
    open_seats = int((first["chance"] < NAMED_LEADER_FROM).sum())
    return PageTable(
        f"In {whole_text(open_seats)} of {whole_text(len(first))} seats nobody is likely to win on polling "
        f"day: no party has a chance of {chance_text(NAMED_LEADER_FROM)}. Below, the {len(body)} seats whose "
        "outcome is least sure, with the two likeliest winners and their chances.",
        ("Seat", "Region", "Likeliest winner", "Next"),
        tuple(body),
        words=frozenset({0, 1, 2, 3}),
    )


def districts_table(contents: ReleaseContents) -> PageTable | None:
    """Set out the districts of several members that are least sure; None without such districts."""
    table = contents.tables.seat_chances
    table = None if table is None else table[table["members"] > 1]
    if table is None or table.empty:
        return None
    loose = (table["expected_members"] - table["expected_members"].round()).abs()
    table = table.assign(loose=loose)
    unsure = table.groupby("seat", sort=False)["loose"].sum().sort_values(ascending=False, kind="stable")
    body = []
    for seat in unsure.index[:CLOSEST_SEATS]:
        rows = table[table["seat"] == seat].sort_values("loose", ascending=False, kind="stable")
        last = rows.head(3).sort_values("expected_members", ascending=False, kind="stable")
        body.append(
            (
                seat_name(rows.to_dict("records")[0]),
                contents.region_names.get(rows["region"].iloc[0], ""),
                whole_text(rows["members"].iloc[0]),
                ", ".join(
                    f"{contents.names[row['code']]} {row['expected_members']:.1f}"
                    for row in last.to_dict("records")
                ),
            )
        )
    return PageTable(
        f"The {len(body)} districts of several members whose outcome on polling day is least sure, and the "
        "three parties between which their last members lie, with the mean of the members each wins.",
        ("District", "Region", "Members", "Mean of members won"),
        tuple(body),
        words=frozenset({0, 1, 3}),
    )


def seats_votes_table(contents: ReleaseContents) -> PageTable | None:
    """Set out what votes bring in seats; None where it was not worked out."""
    table, seats, chamber = contents.tables.seats_votes, contents.tables.seats, contents.chamber
    if table is None or seats is None or chamber is None:
        return None
    body = []
    for code in dict.fromkeys(table["code"]):
        slope = slope_row(table, code=code)
        row = (
            contents.names[code],
            share_text(slope["votes"]),
            f"{slope['mean']:.1f}\n{slope['q05']:.1f} to {slope['q95']:.1f}",
        )
        needed = share_for_majority(table, code=code, line=chamber.middle_line)
        # A line that moves would move on with the votes that are shifted.
        body.append(row if chamber.line_moves else (*row, "–" if needed is None else share_text(needed)))
    opening = (
        "Seats against votes on polling day. Seats a point: what one percent of the vote more brings, 90 % "
        "interval below."
    )
    header = ("", "Votes", "Seats a point")
    if chamber.line_moves:
        return PageTable(opening, header, tuple(body))
    return PageTable(
        f"{opening} Needed: the share of the vote at which the mean of the seats comes to the majority line; "
        "a dash: more than ten points away.",
        (*header, "Needed for a majority"),
        tuple(body),
    )


def equal_votes_sentences(contents: ReleaseContents) -> list[str]:
    """Say who would have more seats at equal votes."""
    table = contents.tables.seats_votes
    if table is None:
        return []
    return [_equal_votes(row, contents) for row in lead_rows(table).to_dict("records")]


def _equal_votes(row: dict[Hashable, Any], contents: ReleaseContents) -> str:
    code, rival = contents.names[row["code"]], contents.names[row["against"]]
    ends = row["q05"], row["q95"]
    if round(row["mean"]) < 0:
        code, rival, ends = rival, code, (-row["q95"], -row["q05"])
    more = round(abs(row["mean"]))
    said = (
        f"{code} would have {more:,} seat{'' if more == 1 else 's'} more"
        if more
        else "their seats would be about equal"
    )
    return (
        f"If {code} and {rival} had equal votes ({share_text(row['votes'])} each), {said} "
        f"(90 % interval of the difference {_signed(ends[0])} to {_signed(ends[1])})."
    )


def _signed(number: float) -> str:
    whole = round(number)
    return f"−{abs(whole):,}" if whole < 0 else f"{whole:,}"


def _chance_of(row: dict[Hashable, Any], contents: ReleaseContents) -> str:
    return f"{contents.names[row['code']]} {chance_text(row['chance'])}"


def _seats_over_interval(row: pd.Series | None) -> str:
    return "–" if row is None else f"{whole_text(row['mean'])}\n{whole_interval(row['q05'], row['q95'])}"
