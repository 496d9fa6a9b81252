"""How votes become seats, in the words of the method note."""

from __future__ import annotations

from collections.abc import Sequence

from aggregator.inputs.contest import CountingRule
from aggregator.inputs.counting_terms import Across, CountingTerms, Divisors, Overhang, Quota, TieBreak
from aggregator.release.combination_words import listed
from aggregator.release.contents import ReleaseContents

_BY_ROW = (
    "In each draw, every seat or district starts from its last result and moves with its region's support, "
    "strongholds not all alike, plus local noise of its own; those of a region are then re-centred so that "
    "together they show the region's support."
)
_METHODS = {
    Divisors.DHONDT: "D'Hondt's divisors",
    Divisors.SAINTE_LAGUE: "Sainte-Laguë's divisors",
    Divisors.MODIFIED_SAINTE_LAGUE: "the modified divisors of Sainte-Laguë",
    Quota.HARE: "largest remainders after the Hare quota",
    Quota.DROOP: "largest remainders after the Droop quota",
}
_ACROSS = {
    Across.DISTRICT: "district by district",
    Across.REGION: "region by region",
}
_OVERHANG = {
    Overhang.KEPT: "a party with more local seats than its part keeps them, and the chamber grows by them",
    Overhang.LEVELLED: "where a party has more local seats than its part the chamber grows until all is in "
    "proportion",
    Overhang.WITHIN: "a party with more local seats than its part keeps them, and the others share the rest",
}


def describe_counting(contents: ReleaseContents) -> list[str]:
    """Say how this contest counts, rule by rule."""
    groups = contents.contest.counting_groups
    sentences = [_BY_ROW] if any(terms.elects_by_row for terms, _ in groups) else []
    if sentences and contents.inputs.candidates is not None:
        sentences += _candidates(members=bool(contents.inputs.candidates["holder"].any()))
    if sentences and contents.inputs.before_last is not None:
        sentences.append("How far seats stray was learned from the last two results.")
    for terms, regions in groups:
        where = ""
        if len(groups) > 1:
            where = f"In {listed([contents.region_names.get(code, code) for code in regions])}: "
        everywhere = "over the whole country" if len(groups) == 1 else "over all of these"
        sentences += [f"{where}{_rule(terms, everywhere)}", *_threshold(terms, everywhere)]
    if contents.chamber is not None:
        sentences.append(_ties([terms for terms, _ in groups], times=contents.chamber.ties))
    return sentences


def _candidates(*, members: bool) -> list[str]:
    """Say what the desk's list of candidates does to the count."""
    told = [
        "A party without a candidate in a seat gets no votes there; where it stands in the same seats of a "
        "region as last time, its support there is taken to be in those."
    ]
    if members:
        told.append(
            "Sitting members who stand again are given a pull, an assumption, where it is new since the last "
            "election; it is taken away where they retire."
        )
    return told


def _ties(terms: Sequence[CountingTerms], *, times: int) -> str:
    """Say how ties are broken, and how often it was needed."""
    more_votes = any(each.has_lists and each.ties is TieBreak.MOST_VOTES for each in terms)
    how = "in favour of more votes where the contest says so, else by lot" if more_votes else "by lot"
    needed = "no draw of this release needed it" if times == 0 else f"this release needed it {times:,} times"
    return f"An exact tie is broken {how}; {needed}."


def _rule(terms: CountingTerms, everywhere: str) -> str:
    match terms.rule:
        case CountingRule.PLURALITY:
            return "The party with most votes wins the seat."
        case CountingRule.TWO_ROUND:
            finalists = (
                "the first two"
                if terms.run_off_threshold is None
                else f"all with {terms.run_off_threshold:g} % or more"
            )
            return (
                f"Who has more than {terms.outright:g} % of the votes wins the seat; else {finalists} run "
                "again, and the voters of the rest move on at rates that the desk states, drawn with their "
                "spread."
            )
        case CountingRule.MIXED_PARALLEL:
            return (
                "The party with most votes wins the local seat; beside them, seats from lists are shared out "
                f"{_lists(terms, everywhere)}."
            )
        case CountingRule.MIXED_COMPENSATORY:
            return (
                "The party with most votes wins the local seat; seats from lists then bring all to "
                f"proportion, {_lists(terms, everywhere)}: {_OVERHANG[terms.overhang]}."
            )
        case _:
            return f"Seats are shared out among lists {_lists(terms, everywhere)}."


def _lists(terms: CountingTerms, everywhere: str) -> str:
    method = terms.divisors or terms.quota
    by = f" by {_METHODS[method]}" if method is not None else ""
    return f"{_where(terms.across, everywhere)}{by}"


def _where(across: Across | None, everywhere: str) -> str:
    """Where votes are added up; ``everywhere`` names the regions that count alike."""
    return _ACROSS.get(across, everywhere) if across is not None else everywhere


def _threshold(terms: CountingTerms, everywhere: str) -> list[str]:
    if terms.threshold is None:
        return []
    joint = "" if terms.alliance_threshold is None else f" ({terms.alliance_threshold:g} % for a joint list)"
    free = f" {listed(list(terms.exempt))} need not." if terms.exempt else ""
    counted = _where(terms.threshold_across, everywhere)
    return [f"A list must have {terms.threshold:g} % of the votes{joint}, counted {counted}.{free}"]
