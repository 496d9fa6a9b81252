"""Whether a threshold leaves anybody in, by the votes of the last election."""

from __future__ import annotations

from collections.abc import Iterator

import pandas as pd

from aggregator.inputs.contest import Contest
from aggregator.inputs.contest_file import CONTEST_FILE
from aggregator.inputs.counting_keys import named_terms
from aggregator.inputs.counting_terms import Across, CountingTerms
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem, Severity


def check_thresholds(contest: Contest, *, last_result: pd.DataFrame) -> Iterator[Problem]:
    """Find thresholds that no party, or one alone, passed at the last election, somewhere they apply.

    Others are many small parties and pass none. One finding a table, naming the places.
    """
    for key, written, regions in named_terms(contest):
        terms = written.settled
        if terms.threshold is None or not regions:
            continue
        shares = _shares(last_result, terms, regions, contest)
        passing = shares.apply(lambda row, t=terms: len(_passing(row, t, contest)), axis=1)
        if (passing == 0).any():
            yield _finding(key, terms, shares[passing == 0], severity=Severity.ERROR)
        elif (passing == 1).any():
            yield _finding(key, terms, shares[passing == 1], severity=Severity.WARNING)


def _shares(
    last_result: pd.DataFrame, terms: CountingTerms, regions: tuple[str, ...], contest: Contest
) -> pd.DataFrame:
    """Percent of the vote by place where the threshold is measured: columns party codes."""
    codes = list(contest.party_codes)
    votes = last_result[codes].fillna(0.0)
    here = last_result["region"].isin(regions)
    if terms.threshold_across is Across.COUNTRY:
        # Lists across the country are those of the regions that count alike, and so is their threshold.
        whole = "the country" if here.all() else ", ".join(regions)
        votes = votes[here].sum().to_frame(whole).T
    elif terms.threshold_across is Across.REGION:
        votes = votes[here].groupby(last_result.loc[here, "region"], sort=False).sum()
    else:
        votes = votes[here].set_axis(last_result.loc[here, "seat"])
    return 100 * votes.div(votes.sum(axis=1), axis=0)


def _passing(share: pd.Series, terms: CountingTerms, contest: Contest) -> set[str]:
    """Who passes with these shares: parties, and joint lists by the codes of their alliances."""
    threshold = terms.threshold or 0.0
    together = terms.alliance_threshold or threshold
    joint = [a for a in contest.alliances if a.joint_list and a.active_on(contest.polling_day)]
    joined = {member for alliance in joint for member in alliance.members}
    alone = [p.code for p in contest.parties if p.code not in joined]
    passing = {
        code for code in alone if share[code] > 0 and (share[code] >= threshold or code in terms.exempt)
    }
    for alliance in joint:
        whole = share[list(alliance.members)].sum()
        free = all(member in terms.exempt for member in alliance.members)
        if whole > 0 and (whole >= together or free):
            passing.add(alliance.code)
    return passing


def _finding(key: str, terms: CountingTerms, shares: pd.DataFrame, *, severity: Severity) -> Problem:
    places = [str(place) for place in shares.index]
    named = ", ".join(places[:5]) + (f", … ({len(places)} in total)" if len(places) > 5 else "")
    excluded = severity is Severity.ERROR
    many, who = ("some lists", "nobody") if excluded else ("several lists", "one list only")
    remedy = (
        "Lower it; it is in percent, 5 for 5 %."
        if excluded
        else "Check the number: whoever passes alone takes every seat from lists."
    )
    return Problem(
        CONTEST_FILE, None, f"{key}.threshold", f"{terms.threshold:g}",
        f"a percentage that {many} reach; at the last election {who} did in {named}", remedy,
        Rule.THRESHOLD, severity,
    )  # fmt: skip
