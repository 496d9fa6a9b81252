"""How far figures spread, against sampling alone.

Polls of one house taken within six weeks differ by sampling, rounding and movement, the polls of several
houses by house effects too. Movement and house effects only add, so a spread *below* sampling and rounding
deserves a question. Windows and regions add up. Design effects are taken as 1, the least there is without
weighting to past votes, so that real ones only make a question rarer.

Where the fit's expected shares are given, they take the place of each window's mean for the looks at
houses. At a draw of the posterior the statistic has the full number of degrees of freedom, polls times
codes, without a correction for what was fitted (Johnson 2004); its chances over draws are combined as twice
their mean, which is a valid chance whatever their dependence (Vovk & Wang 2020).

The chi-square distribution knows no grid: in whole points a few polls of a small party agree exactly far
more often than it says. A look that it calls rare, and that has few degrees of freedom, is therefore held
against honest figures that are drawn and printed with the same samples and steps of rounding too, and the
larger of the two chances counts. Printed figures are made to sum to 100, which ties the rounding of all codes
together in ways that differ by house: at all codes together only the variance of sampling is counted.

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
    Flags,
    Floats,
    Places,
    draw_printed,
    draw_window_spreads,
    read_answers,
    shows_sampling,
    spread_about,
    window_spread,
)

# Fewer polls cannot show a spread that is too small.
LEAST_DEGREES = 5
# Draws of the posterior that a chance is averaged over.
DRAWS_FOR_CHANCE = 200
# From here on the grid of rounding averages out.
MOST_DEGREES_DRAWN = 60
# Enough to tell a chance of one in some thousand, which a hundred looks need.
HONEST_DRAWS = 20_000
# Figures on one grid tie exactly, up to rounding of the arithmetic.
_TIE = 1e-9


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
    rng: np.random.Generator,
) -> list[Question]:
    """Ask where figures spread less than sampling and rounding alone would make them.

    Parameters as for :func:`spread_looks`.
    """
    looks = spread_looks(polls, codes=codes, regions=regions, expected=expected, rng=rng)
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
    rng: np.random.Generator,
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
    rng
        Draws honest figures where chances are small.
    """
    # In an order of their own, so that the order of the register changes nothing.
    rows = without_shared_interviews(polls).sort_values(["house", "end", "poll"], kind="stable")
    rows = rows.reset_index(drop=True)
    answers = read_answers(rows, codes=codes)
    looks: list[Look] = []
    for house, of_house in rows.groupby("house", sort=False):
        if expected is None:
            looks += _looks_by_window(answers, _windows(of_house), house=str(house), rng=rng)
        else:
            places = of_house.index.to_numpy()
            looks += _looks_at_fit(answers, places, house=str(house), expected=expected, rng=rng)
    if rows["house"].nunique() > 1:
        national = rows[[set(where) == set(regions) for where in rows["regions"]]]
        looks += _looks_by_window(answers, _windows(national), house="", rng=rng)
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


def _looks_by_window(
    answers: Answers, windows: list[Places], *, house: str, rng: np.random.Generator
) -> Iterator[Look]:
    given = ~np.isnan(answers.share)
    for number, code in enumerate(answers.codes):
        parts = [(window[given[window, number]], np.array([number])) for window in windows]
        yield from _look(answers, parts, house=house, code=code, rng=rng)
    parts = [_figures_most_give(answers, window) for window in windows]
    yield from _look(answers, parts, house=house, code="", rng=rng)


def _figures_most_give(answers: Answers, window: Places) -> tuple[Places, Places]:
    """Rows that give every code which half of the rows or more give, and those codes."""
    given = ~np.isnan(answers.share[window])
    codes = np.flatnonzero(given.mean(axis=0) >= 0.5)
    rows = window[given[:, codes].all(axis=1)]
    return rows, answers.free_codes(rows, codes)


def _look(
    answers: Answers, parts: list[tuple[Places, Places]], *, house: str, code: str, rng: np.random.Generator
) -> Iterator[Look]:
    """Add windows up to one look."""
    statistic, degrees, polls = 0.0, 0, list[str]()
    windows: list[tuple[Floats, Floats, Floats]] = []
    for rows, codes in parts:
        if len(rows) < 2:
            continue
        share, respondents = answers.share[np.ix_(rows, codes)], answers.respondents[rows]
        step = answers.step[rows]
        middle = respondents @ share / respondents.sum()
        shown = shows_sampling(middle, respondents=respondents, step=step)
        if shown.any():
            counted = _counted_step(step, code)
            found, free = window_spread(share[:, shown], respondents=respondents, step=counted)
            statistic, degrees = statistic + found, degrees + free
            polls += [answers.poll[row] for row in rows]
            windows.append((middle[shown], respondents, step))
    if not degrees:
        return
    chance = float(chi2.cdf(statistic, degrees))
    if chance < LEVEL and degrees < MOST_DEGREES_DRAWN:
        drawn = np.zeros(HONEST_DRAWS)
        for middle, respondents, step in windows:
            drawn += draw_window_spreads(
                middle,
                respondents=respondents,
                step=step,
                counted_step=_counted_step(step, code),
                draws=HONEST_DRAWS,
                rng=rng,
            )
        chance = max(chance, _rank_chance(drawn <= statistic + _TIE))
    yield Look(house, code, tuple(polls), statistic, degrees, chance)


def _counted_step(step: Floats, code: str) -> Floats:
    """Step of rounding whose variance counts: none at all codes together."""
    return step if code else np.zeros_like(step)


def _rank_chance(as_low: Flags) -> float:
    """Chance of a value as low among honest ones; never zero, since honest draws are finite."""
    return float((1 + as_low.sum()) / (1 + as_low.size))


def _looks_at_fit(
    answers: Answers,
    rows: Places,
    *,
    house: str,
    expected: ExpectedFigures,
    rng: np.random.Generator,
) -> Iterator[Look]:
    thin = slice(None, None, max(1, expected.share.sizes["sample"] // DRAWS_FOR_CHANCE))
    share = expected.share.isel(sample=thin).sel(code=list(answers.codes))
    shares = share.transpose("sample", "row", "code").to_numpy()
    deffs = expected.design_effect.isel(sample=thin).transpose("sample", "row").to_numpy()
    place = {row: number for number, row in enumerate(expected.share["row"].values.tolist())}
    known = [row for row in rows if answers.row[row] in place]
    for number, code in [*enumerate(answers.codes), (None, "")]:
        cells = []
        for row in known:
            at = place[answers.row[row]]
            codes = _codes_of_row(answers, row, number=number)
            respondents, step = answers.respondents[[row]], answers.step[[row]]
            middle = shares[:, at, codes].mean(axis=0)
            shown = codes[shows_sampling(middle, respondents=respondents, step=step)]
            if shown.size:
                cells.append((row, shown, shares[:, at, shown], respondents / deffs[:, at]))
        if cells:
            yield _look_at_cells(answers, cells, house=house, code=code, rng=rng)


def _codes_of_row(answers: Answers, row: int, *, number: int | None) -> Places:
    """Codes of a row whose sum is free: one, or all it gives."""
    codes = np.arange(len(answers.codes)) if number is None else np.array([number])
    codes = codes[~np.isnan(answers.share[row, codes])]
    return answers.free_codes(np.array([row]), codes) if number is None else codes


def _look_at_cells(
    answers: Answers,
    cells: list[tuple[int, Places, Floats, Floats]],
    *,
    house: str,
    code: str,
    rng: np.random.Generator,
) -> Look:
    """Look at rows about what was expected of each: its codes, their expected shares, its respondents."""
    degrees = sum(codes.size for _, codes, _, _ in cells)
    counted = _counted_step(answers.step, code)
    statistic = np.zeros(len(cells[0][2]))
    for row, codes, middle, respondents in cells:
        statistic += spread_about(
            answers.share[row, codes], expected=middle, respondents=respondents, step=counted[row]
        )
    chance = min(1.0, 2 * float(chi2.cdf(statistic, degrees).mean()))
    if chance < LEVEL and degrees < MOST_DEGREES_DRAWN:
        drawn = np.zeros((HONEST_DRAWS // len(statistic), len(statistic)))
        for row, _, middle, respondents in cells:
            step = np.full(len(middle), answers.step[row])
            printed = draw_printed(middle, respondents=respondents, step=step, draws=len(drawn), rng=rng)
            drawn += spread_about(printed, expected=middle, respondents=respondents, step=counted[row])
        chance = max(chance, min(1.0, 2 * _rank_chance(drawn <= statistic + _TIE)))
    polls = tuple(answers.poll[row] for row, *_ in cells)
    return Look(house, code, polls, float(statistic.mean()), degrees, chance)


def _question(look: Look, *, looks: int) -> Question:
    what = f"the figures for {look.code}" if look.code else "the figures"
    noise = "sampling and rounding" if look.code else "sampling"
    found = (
        f"X² {look.statistic:.1f} on {look.degrees} degrees of freedom, {look.ratio:.2f} of the variance of "
        f"{noise}; chance of so little {look.chance:.1g}"
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
