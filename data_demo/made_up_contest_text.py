"""The contest file of an invented election, with comments for the person who edits it."""

from __future__ import annotations

import json

from data_demo.made_up_counting import MixedCounting
from data_demo.made_up_scenery import MadeUpAlliance, MadeUpJolt, MadeUpParty, MadeUpRegion, Scenery


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
        _plurality(scenery) if scenery.counting is None else _mixed(scenery.counting, scenery=scenery),
    ]
    return "\n".join(blocks)


def _plurality(scenery: Scenery) -> str:
    return (
        "[counting]\n"
        'rule = "plurality"    # the most votes in a seat win it\n'
        f"seats = {scenery.seat_count}\n"
        f"majority = {scenery.seat_count // 2 + 1}\n"
    )


def _mixed(counting: MixedCounting, *, scenery: Scenery) -> str:
    named = {region.code: region for region in scenery.regions}
    members = sum(sum(named[code].members_by_seat) for code in counting.by_district)
    apart = counting.by_district + counting.by_two_rounds
    local = sum(len(r.seat_names) for r in scenery.regions if r.code not in apart)
    two_rounds = sum(len(named[code].seat_names) for code in counting.by_two_rounds)
    blocks = [
        "# The whole chamber. A majority is not named: where the chamber grows, so does the line.\n"
        "[counting]\n"
        'rule = "mixed_compensatory"    # local seats by the most votes; lists make up the proportion\n'
        f"seats = {scenery.seat_count}    # {local} local, {counting.list_seats} from lists,"
        f" {members} in districts, {two_rounds} in two rounds\n"
        f"list_seats = {counting.list_seats}\n"
        'across = "country"    # votes of lists are added up over all regions that count like this\n'
        'divisors = "sainte_lague"\n'
        f"threshold = {counting.threshold}    # percent of all votes there; below it, no list seat\n"
        f"exempt = [{_texts(counting.exempt)}]    # gets list seats with less than that\n"
        'overhang = "levelled"    # more seats won locally than in proportion: the chamber grows\n',
        "# Districts of several members; `seats` in result_last.csv says how many.\n"
        "[[counting.where]]\n"
        f"regions = [{_texts(counting.by_district)}]\n"
        'rule = "highest_averages"\n'
        'divisors = "dhondt"\n'
        'across = "district"\n',
        "# One member each: more than half the votes, or a run-off between the first two. Where voters go\n"
        "# when their party is out is in transfers.csv.\n"
        "[[counting.where]]\n"
        f"regions = [{_texts(counting.by_two_rounds)}]\n"
        'rule = "two_round"\n',
    ]
    return "\n".join(blocks)


def _party(party: MadeUpParty) -> str:
    lines = ["[[party]]", f"code = {_text(party.code)}", f"name = {_text(party.name)}"]
    if party.colour is not None:
        lines.append(f"colour = {_text(party.colour)}")
    if party.regions is not None:
        lines.append(f"regions = [{_texts(party.regions)}]    # stands only there")
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
    lines.append(f"members = [{_texts(alliance.members)}]")
    if alliance.from_ is not None:
        lines.append(f"from = {alliance.from_}    # from this day polls may give one figure for all members")
    return "\n".join(lines) + "\n"


def _text(value: str) -> str:
    return json.dumps(value, ensure_ascii=False)


def _texts(values: tuple[str, ...]) -> str:
    return ", ".join(_text(value) for value in values)
