"""How far figures spread, against sampling alone.

Polls of one house taken within six weeks differ by sampling, rounding and movement, the polls of several
houses by house effects too. Movement and house effects only add, so a spread *below* sampling and rounding
deserves a question. Windows and regions add up. Design effects are taken as 1, the least there is without
weighting to past votes, so that real ones only make a question rarer.

Where the fit's expected shares are given, they take the place of each window's mean for the looks at
houses. At a draw of the posterior the statistic has the full number of degrees of freedom, polls times
codes, without a correction for what was fitted (Johnson 2004); its chances over draws are combined as twice
their mean, which is a valid chance whatever their dependence (Vovk & Wang 2020).

Every house, the whole field and every code of each is a look. Half the level goes to looks at all codes
together, half to looks at single codes; in each half chances are adjusted by Benjamini & Hochberg's
procedure, as scipy has it.

References
----------
Johnson (2004), "A Bayesian χ² test for goodness-of-fit", Annals of Statistics 32:2361–2384.
Vovk & Wang (2020), "Combining p-values via averaging", Biometrika 107:791–808.
Benjamini & Hochberg (1995), "Controlling the false discovery rate", JRSS B 57:289–300.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import xarray as xr
from scipy.stats import chi2, false_discovery_control

from aggregator.screens.questions import LEVEL, Question, Screen, joined_polls
from aggregator.screens.register_series import WINDOW_DAYS, window_of_row, without_shared_interviews
from aggregator.screens.spread_statistic import (
    Answers,
    Places,
    read_answers,
    shows_sampling,
    spread_about,
    window_spread,
)

# Fewer polls cannot show a spread that is too small.
LEAST_DEGREES = 5
# Draws of the posterior that a chance is averaged over.
DRAWS_FOR_CHANCE = 200


@dataclass(frozen=True)
class ExpectedFigures:
    """What a fit expects each row to print.

    Attributes
    ----------
    share
        Expected shares 0–1, leans included, at draws of the posterior: dims (sample, row, code), coords
        ``row`` (row of the register) and ``code`` (columns of the register).
    design_effect
        Dims (sample, row).
    """

    share: xr.DataArray
    design_effect: xr.DataArray


@dataclass(frozen=True)
class Look:
    """One comparison of a spread with sampling.

    Attributes
    ----------
    house, code
        Blank: all houses, all codes.
    polls
        Identifiers of the polls looked at.
    statistic, degrees
        X² (its mean over draws) and its degrees of freedom.
    chance
        Chance of so little spread or less under sampling and rounding.
    """

    house: str
    code: str
    polls: tuple[str, ...]
    statistic: float
    degrees: int
    chance: float

    @property
    def ratio(self) -> float:
        """Variance found over that of sampling and rounding."""
        return self.statistic / self.degrees


def ask_about_spread(
    polls: pd.DataFrame,
    *,
    codes: Sequence[str],
    regions: Sequence[str],
    expected: ExpectedFigures | None = None,
) -> list[Question]:
    """Ask where figures spread less than sampling and rounding alone would make them.

    Parameters as for :func:`spread_looks`.
    """
    looks = spread_looks(polls, codes=codes, regions=regions, expected=expected)
    questions = []
    for family in ([x for x in looks if not x.code], [x for x in looks if x.code]):
        if not family:
            continue
        adjusted = false_discovery_control([look.chance for look in family], method="bh")
        questions += [
            _question(look, looks=len(looks))
            for look, chance in zip(family, adjusted, strict=True)
            if chance <= LEVEL / 2
        ]
    return questions


def spread_looks(
    polls: pd.DataFrame,
    *,
    codes: Sequence[str],
    regions: Sequence[str],
    expected: ExpectedFigures | None = None,
) -> list[Look]:
    """All looks at a register, whether they lead to a question or not.

    Parameters
    ----------
    polls
        As ``DeskInputs.polls``.
    codes
        Columns with shares.
    regions
        All regions of the contest: rows that ask in all of them are compared between houses.
    expected
        Expected shares of a fit; without them the means of windows are taken.
    """
    rows = without_shared_interviews(polls).reset_index(drop=True)
    answers = read_answers(rows, codes=codes)
    looks: list[Look] = []
    for house, of_house in rows.groupby("house", sort=False):
        if expected is None:
            looks += _looks_by_window(answers, _windows(of_house), house=str(house))
        else:
            looks += _looks_at_fit(answers, of_house.index.to_numpy(), house=str(house), expected=expected)
    if rows["house"].nunique() > 1:
        national = rows[[set(where) == set(regions) for where in rows["regions"]]]
        looks += _looks_by_window(answers, _windows(national), house="")
    return [look for look in looks if look.degrees >= LEAST_DEGREES]


def _windows(rows: pd.DataFrame) -> list[Places]:
    """Places of the rows of each window with two rows or more, series by series."""
    return [
        places
        for _, series in rows.groupby(rows["regions"].map(frozenset), sort=False)
        for places in _split(series.index.to_numpy(), by=window_of_row(series))
        if len(places) > 1
    ]


def _split(places: Places, *, by: Places) -> list[Places]:
    return [places[by == number] for number in np.unique(by)]


def _looks_by_window(answers: Answers, windows: list[Places], *, house: str) -> Iterator[Look]:
    given = ~np.isnan(answers.share)
    for number, code in enumerate(answers.codes):
        parts = [(window[given[window, number]], np.array([number])) for window in windows]
        yield from _look(answers, parts, house=house, code=code)
    yield from _look(answers, [_figures_most_give(answers, w) for w in windows], house=house, code="")


def _figures_most_give(answers: Answers, window: Places) -> tuple[Places, Places]:
    """Rows that give every code which half of the rows or more give, and those codes."""
    given = ~np.isnan(answers.share[window])
    codes = np.flatnonzero(given.mean(axis=0) >= 0.5)
    rows = window[given[:, codes].all(axis=1)]
    return rows, answers.free_codes(rows, codes)


def _look(answers: Answers, parts: list[tuple[Places, Places]], *, house: str, code: str) -> Iterator[Look]:
    """Add windows up to one look."""
    statistic, degrees, polls = 0.0, 0, list[str]()
    for rows, codes in parts:
        if len(rows) < 2:
            continue
        share, respondents = answers.share[np.ix_(rows, codes)], answers.respondents[rows]
        middle = respondents @ share / respondents.sum()
        shown = shows_sampling(middle, respondents=respondents, step=answers.step[rows])
        if shown.any():
            found, free = window_spread(share[:, shown], respondents=respondents, step=answers.step[rows])
            statistic, degrees = statistic + found, degrees + free
            polls += [answers.poll[row] for row in rows]
    if degrees:
        yield Look(house, code, tuple(polls), statistic, degrees, float(chi2.cdf(statistic, degrees)))


def _looks_at_fit(answers: Answers, rows: Places, *, house: str, expected: ExpectedFigures) -> Iterator[Look]:
    thin = slice(None, None, max(1, expected.share.sizes["sample"] // DRAWS_FOR_CHANCE))
    share = expected.share.isel(sample=thin).sel(code=list(answers.codes))
    shares = share.transpose("sample", "row", "code").to_numpy()
    deffs = expected.design_effect.isel(sample=thin).transpose("sample", "row").to_numpy()
    place = {row: number for number, row in enumerate(expected.share["row"].values.tolist())}
    known = [row for row in rows if answers.row[row] in place]
    everything = np.arange(len(answers.codes))
    for number, code in [*enumerate(answers.codes), (None, "")]:
        statistic, degrees, polls = np.zeros(len(shares)), 0, list[str]()
        for row in known:
            codes = everything if number is None else np.array([number])
            codes = codes[~np.isnan(answers.share[row, codes])]
            if number is None:
                codes = answers.free_codes(np.array([row]), codes)
            at = place[answers.row[row]]
            real, middle = answers.respondents[row] / deffs[:, at], shares[:, at, codes]
            step = answers.step[row]
            shown = shows_sampling(
                middle.mean(axis=0), respondents=answers.respondents[[row]], step=answers.step[[row]]
            )
            if shown.any():
                statistic += spread_about(
                    answers.share[row, codes[shown]], expected=middle[:, shown], respondents=real, step=step
                )
                degrees += int(shown.sum())
                polls.append(answers.poll[row])
        if degrees:
            chance = min(1.0, 2 * float(chi2.cdf(statistic, degrees).mean()))
            yield Look(house, code, tuple(polls), float(statistic.mean()), degrees, chance)


def _question(look: Look, *, looks: int) -> Question:
    what = f"the figures for {look.code}" if look.code else "the figures"
    found = (
        f"X² {look.statistic:.1f} on {look.degrees} degrees of freedom, {look.ratio:.2f} of the variance of "
        f"sampling and rounding; chance of so little {look.chance:.1g}"
    )
    innocent = (
        "Weighting to past votes does this and is sound work; so do rounding by a rule of the house's own, "
        "samples pooled or carried over from poll to poll, and design effects below 1 from strata or quotas."
    )
    if look.house:
        question = (
            f"Could something in the way {look.house} weights, smooths or pools its samples hold {what} of "
            f"polls within {WINDOW_DAYS // 7} weeks together? {innocent}"
        )
    else:
        question = (
            "Could something that the houses share (a weighting target, a panel, a supplier of interviews) "
            f"hold {what} together, or were they weighted to each other's? {innocent}"
        )
    return Question(
        Screen.SPREAD,
        look.house,
        look.code,
        joined_polls(look.polls),
        found,
        f"1.00 or more; {looks} looks were made, and allowed for",
        question,
    )
