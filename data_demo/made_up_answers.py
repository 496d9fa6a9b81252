"""From opinion to printed figures: what a sample is expected to answer, what it answers, what is printed."""

from __future__ import annotations

from datetime import date

import numpy as np

from data_demo.made_up_country import Country, softmax
from data_demo.made_up_scenery import OTHERS, MadeUpHouse, Scenery


def expected_answers(country: Country, *, effect: np.ndarray, first_day: int, last_day: int) -> np.ndarray:
    """Mean answer over a window, dims (region, party): support, shared lean, and what the house adds.

    Parameters
    ----------
    effect
        Everything that makes the house's figures differ, log points, dims (party,).
    """
    window = slice(first_day, last_day + 1)
    return softmax(country.log_support[window] + country.lean[window] + effect).mean(axis=0)


def group_codes(
    scenery: Scenery, *, house: MadeUpHouse, day: date, rng: np.random.Generator
) -> dict[str, list[int]]:
    """Settle what the house offers: printed code to the positions of the parties in it."""
    groups = {code: [j] for j, code in enumerate(scenery.codes)}
    for alliance in scenery.alliances:
        exists = alliance.from_ is None or alliance.from_ <= day
        if alliance.code in house.pools and exists and rng.random() < 0.6:
            groups[alliance.code] = [groups.pop(member)[0] for member in alliance.members]
    for code in house.lumps:
        if code in groups and rng.random() < 0.8:
            groups[OTHERS] += groups.pop(code)
    return groups


def draw_answers(
    expected: np.ndarray,
    *,
    groups: dict[str, list[int]],
    respondents: int,
    deff: float,
    rng: np.random.Generator,
) -> dict[str, int]:
    """Dirichlet-multinomial counts whose variance is ``deff`` times a simple random sample's.

    Raises
    ------
    ValueError
        Where there are no more respondents than the design effect.
    """
    offered = {code: float(expected[members].sum()) for code, members in groups.items()}
    offered = {code: share for code, share in offered.items() if share > 0}
    if respondents <= deff:
        raise ValueError(f"A row of {respondents} respondents cannot bear a design effect of {deff:.1f}.")
    precision = (respondents - deff) / (deff - 1)
    shares = rng.dirichlet(precision * np.array(list(offered.values())))
    return dict(zip(offered, rng.multinomial(respondents, shares).tolist(), strict=True))


def print_cells(
    cells: dict[str, int], *, house: MadeUpHouse, sample: int, decided: int, kappa: float
) -> dict[str, object]:
    """Percentages as the house prints them: of everyone where it publishes the undecided.

    Parameters
    ----------
    kappa
        What weighting costs the house: its effective sample is this many times smaller.
    """
    base = decided if house.undecided is None else sample
    printed: dict[str, object] = {
        code: _rounded(100 * count / base, grid=house.grid)
        for code, count in cells.items()
        if code != OTHERS or house.lists_others
    }
    if house.undecided is not None:
        printed["undecided"] = _rounded(100 * (sample - decided) / sample, grid=house.grid)
    if house.gives_effective:
        printed["effective"] = round(sample / kappa)
    return printed


def _rounded(percent: float, *, grid: float) -> float:
    return round(float(np.floor(percent / grid + 0.5)) * grid, 1)
