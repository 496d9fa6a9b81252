"""Which keys of ``contest.toml`` each counting rule takes and needs, and where it holds."""

from __future__ import annotations

from collections.abc import Iterator

from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.contest_references import check_references
from aggregator.inputs.counting_terms import (
    LIST_RULES,
    MIXED_RULES,
    Across,
    CountingRule,
    CountingTerms,
    Divisors,
)
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem

_OF_LISTS = frozenset(
    {"across", "threshold", "threshold_across", "alliance_threshold", "exempt", "ties", "list_seats"}
)
_OF_MIXED = _OF_LISTS | {"divisors", "first_divisor", "quota"}

TAKEN_KEYS: dict[CountingRule, frozenset[str]] = {
    CountingRule.NONE: frozenset(),
    CountingRule.PLURALITY: frozenset(),
    CountingRule.TWO_ROUND: frozenset({"outright", "run_off_threshold"}),
    CountingRule.HIGHEST_AVERAGES: _OF_LISTS | {"divisors", "first_divisor"},
    CountingRule.LARGEST_REMAINDER: _OF_LISTS | {"quota"},
    CountingRule.MIXED_PARALLEL: _OF_MIXED,
    CountingRule.MIXED_COMPENSATORY: _OF_MIXED | {"overhang"},
}
"""The keys each rule takes besides ``rule`` itself."""

# What a threshold must stand beside to mean anything.
_OF_THRESHOLD = ("threshold_across", "alliance_threshold", "exempt")
_WIDTH = {across: width for width, across in enumerate(Across)}

type NamedTerms = tuple[str, CountingTerms, tuple[str, ...]]


def check_counting(contest: Contest) -> list[Problem]:
    """Find what is wrong with the counting rules in themselves, before any other file is seen."""
    tables = named_terms(contest)
    return [
        *_check_where(contest),
        *(p for key, terms, _ in tables for p in _check_taken(key, terms)),
        *(p for key, terms, _ in tables for p in _check_methods(key, terms, contest)),
        *(p for key, terms, _ in tables for p in _check_thresholds(key, terms, contest)),
        *(p for key, terms, regions in tables for p in _check_list_seats(key, terms, regions, contest)),
        *_check_region_seats(contest),
        *_check_joint_lists(contest),
    ]


def named_terms(contest: Contest) -> list[NamedTerms]:
    """List the tables of terms as written: key path, terms, and the regions they hold in."""
    apart = {region for where in contest.counting.where for region in where.regions}
    rest = tuple(r for r in contest.region_codes if r not in apart)
    tables: list[NamedTerms] = [("counting", contest.counting, rest)]
    for i, where in enumerate(contest.counting.where, start=1):
        regions = tuple(r for r in contest.region_codes if r in where.regions)
        tables.append((f"counting.where[{i}]", where, regions))
    return tables


def _problem(key: str, found: str, expected: str, remedy: str, rule: Rule = Rule.COUNTING_KEYS) -> Problem:
    return Problem(CONTEST_FILE, None, key, found, expected, remedy, rule)


def _check_where(contest: Contest) -> Iterator[Problem]:
    regions = [r.code for r in contest.regions]
    first: dict[str, int] = {}
    for i, where in enumerate(contest.counting.where, start=1):
        key = f"counting.where[{i}]"
        yield from check_references(f"{key}.regions", where.regions, known=regions, what="region")
        for place, region in enumerate(where.regions, start=1):
            earlier = first.setdefault(region, i)
            if earlier != i:
                yield _problem(
                    f"{key}.regions[{place}]", f'"{region}", already in counting.where[{earlier}]',
                    "each region by one rule", "Delete it from one of the two.", Rule.COUNTING_WHERE,
                )  # fmt: skip
        if where.rule is CountingRule.NONE:
            yield _problem(
                f"{key}.rule", '"none"', "a rule that fills seats, as in the other regions",
                "Name the rule; none holds for a whole contest or not at all.", Rule.COUNTING_WHERE,
            )  # fmt: skip
    if contest.counting.where and contest.counting.rule is CountingRule.NONE:
        yield _problem(
            "counting.rule", '"none"', "a rule that fills seats, as in the regions of counting.where",
            "Name the rule; none holds for a whole contest or not at all.", Rule.COUNTING_WHERE,
        )  # fmt: skip
    if regions and set(regions) <= set(first):
        yield _problem(
            "counting.where", "tables for all regions", "some region by the rule of [counting]",
            "Give one of these tables to [counting] itself, and leave its regions out.", Rule.COUNTING_WHERE,
        )  # fmt: skip


def _check_taken(key: str, terms: CountingTerms) -> Iterator[Problem]:
    for name in CountingTerms.model_fields:
        if name == "rule" or name not in terms.model_fields_set or name in TAKEN_KEYS[terms.rule]:
            continue
        takers = ", ".join(rule for rule, keys in TAKEN_KEYS.items() if name in keys)
        unsaid = "" if "rule" in terms.model_fields_set else ", which holds since none is named"
        yield _problem(
            f"{key}.{name}", _shown(getattr(terms, name)), f"no such key with rule {terms.rule}{unsaid}",
            f"Delete it, or name a rule that takes it: {takers}.",
        )  # fmt: skip


def _check_methods(key: str, terms: CountingTerms, contest: Contest) -> Iterator[Problem]:
    given = terms.model_fields_set & TAKEN_KEYS[terms.rule]
    if {"divisors", "quota"} <= given:
        yield _problem(
            f"{key}.quota", _shown(terms.quota), "divisors or a quota, not both", "Delete one of the two."
        )
    if "first_divisor" in given and terms.divisors is not Divisors.MODIFIED_SAINTE_LAGUE:
        yield _problem(
            f"{key}.first_divisor", _shown(terms.first_divisor),
            f'divisors = "{Divisors.MODIFIED_SAINTE_LAGUE}" beside it',
            "Delete it, or name those divisors: the others begin at 1.",
        )  # fmt: skip
    if terms.rule in MIXED_RULES and terms.across is Across.DISTRICT:
        yield _problem(
            f"{key}.across", _shown(terms.across), f"{Across.REGION} or {Across.COUNTRY}",
            "Say where the votes of the lists are added up; seats won locally need no key.",
        )  # fmt: skip
    if "across" in given and terms.across is Across.REGION and not contest.regions:
        yield _problem(
            f"{key}.across", _shown(terms.across), "a contest with regions",
            f'Set across = "{Across.COUNTRY}", or add each [[region]].',
        )  # fmt: skip


def _check_thresholds(key: str, terms: CountingTerms, contest: Contest) -> Iterator[Problem]:
    given = terms.model_fields_set & TAKEN_KEYS[terms.rule]
    for name in _OF_THRESHOLD:
        if name in given and terms.threshold is None:
            yield _problem(
                f"{key}.{name}", _shown(getattr(terms, name)), "threshold beside it",
                "Add threshold, or delete this key.",
            )  # fmt: skip
    yield from check_references(
        f"{key}.exempt", terms.exempt, known=[p.code for p in contest.parties], what="party"
    )
    if "alliance_threshold" in given and not any(a.joint_list for a in contest.alliances):
        yield _problem(
            f"{key}.alliance_threshold", _shown(terms.alliance_threshold),
            "an alliance with joint_list = true",
            "Mark the alliances whose members run as one list, or delete the key.",
        )  # fmt: skip
    across, measured = terms.settled.across, terms.settled.threshold_across
    if across is None or measured is None or "threshold_across" not in given:
        return
    wider = [a for a in Across if _WIDTH[a] >= _WIDTH[across]]
    if measured not in wider:
        yield _problem(
            f"{key}.threshold_across", _shown(measured),
            f"{' or '.join(wider)}, since seats are shared out across the {across}",
            "Measure the threshold where seats are shared out, or more widely.",
        )  # fmt: skip


def _check_list_seats(
    key: str, terms: CountingTerms, regions: tuple[str, ...], contest: Contest
) -> Iterator[Problem]:
    if not terms.has_lists or terms.settled.across is Across.DISTRICT:
        if terms.rule in LIST_RULES and terms.list_seats is not None:
            yield _problem(
                f"{key}.list_seats", str(terms.list_seats), "no such key where districts elect the members",
                "Delete it; the column seats of the last result has the members of each district.",
            )  # fmt: skip
        return
    if terms.settled.across is Across.COUNTRY:
        if terms.rule in MIXED_RULES and terms.list_seats is None:
            yield _problem(
                f"{key}.list_seats", "no such key", f"the seats filled from lists, which {terms.rule} needs",
                'Add the key, or set across = "region" and list_seats in every region.',
            )  # fmt: skip
        return
    if terms.list_seats is not None:
        yield _problem(
            f"{key}.list_seats", str(terms.list_seats),
            f'list_seats in each [[region]], where across = "{Across.REGION}"',
            'Move it to the regions, or set across = "country".',
        )  # fmt: skip
    if terms.rule in MIXED_RULES:
        for i, region in enumerate(contest.regions, start=1):
            if region.code in regions and region.list_seats is None:
                yield _problem(
                    f"region[{i}].list_seats", "no such key",
                    f"the seats filled from lists of {region.code}, which {terms.rule} needs", "Add the key.",
                )  # fmt: skip


def _check_region_seats(contest: Contest) -> Iterator[Problem]:
    for i, region in enumerate(contest.regions, start=1):
        terms = contest.terms_in(region.code)
        if region.list_seats is not None and not (terms.has_lists and terms.across is Across.REGION):
            yield _problem(
                f"region[{i}].list_seats", str(region.list_seats),
                f'a rule with lists in {region.code}, and across = "region"',
                "Delete it, or correct the rule of the region.",
            )  # fmt: skip


def _check_joint_lists(contest: Contest) -> Iterator[Problem]:
    has_lists = any(terms.has_lists for terms, _ in contest.counting_groups)
    joint = [(i, a) for i, a in enumerate(contest.alliances, start=1) if a.joint_list]
    for place, (i, alliance) in enumerate(joint):
        if not has_lists:
            yield _problem(
                f"alliance[{i}].joint_list", "true", "a rule with lists",
                "Delete it, or count by a rule with lists in some region.",
            )  # fmt: skip
        for j, other in joint[:place]:
            both = [m for m in alliance.members if m in other.members]
            if both and alliance.meets(other):
                yield _problem(
                    f"alliance[{i}].joint_list", f"true, while {', '.join(both)} is in the joint list of "
                    f"alliance[{j}] ({other.code}) at that time", "a party on one list at a time",
                    "Set from and until, or mark one of the two.",
                )  # fmt: skip


def _shown(value: object) -> str:
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, tuple):
        return "[" + ", ".join(f'"{v}"' for v in value) + "]"
    return f"{value:g}" if isinstance(value, float) else str(value)
