"""Habits of real registers that must not move the truth: a column of modes, a poll entered by its regions."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date, timedelta
from functools import partial
from pathlib import Path

import numpy as np
import pandas as pd
from threadpoolctl import threadpool_limits

from aggregator.estimate.compiled_election import CompiledElection, compile_election
from aggregator.estimate.fit import fit_contest
from aggregator.estimate.model_arrays import build_arrays
from aggregator.estimate.sampling import ChainPlan
from aggregator.estimate.support import Calendar, support_of_regions
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.settings import RunSettings
from models.arrays import ElectionArrays
from models.priors import Priors

POLLING_DAY, LAST_ELECTION = date(2031, 5, 18), date(2028, 5, 14)
TODAY = date(2031, 5, 4)


def _contest(*, regions: int = 0, model: str = "") -> str:
    lines = ['title = "Assembly"', f"polling_day = {POLLING_DAY}"]
    for code in ("HU", "UP"):
        lines += ["[[party]]", f'code = "{code}"', f'name = "Party {code}"']
    for region in range(regions):
        lines += ["[[region]]", f'code = "R{region:02d}"', f'name = "Region {region:02d}"']
    return "\n".join(
        [*lines, f"[last_result]\ndate = {LAST_ELECTION}", '[counting]\nrule = "none"', model, ""]
    )


# Nine online houses and one by telephone, which finds Harbour Union six points lower than the others.
ONLINE_FINDS, TELEPHONE_FINDS = (0.42, 0.36, 0.22), (0.36, 0.40, 0.24)
POLLS_OF_A_HOUSE = 4


def _write_ten_houses(folder: Path, *, with_modes: bool) -> Path:
    folder.mkdir()
    rng = np.random.default_rng(7)
    rows = ["house,start,end,published,sample,mode,HU,UP,OTH"]
    for house in range(10):
        finds, mode = (TELEPHONE_FINDS, "telephone") if house == 9 else (ONLINE_FINDS, "online")
        for poll in range(POLLS_OF_A_HOUSE):
            end = TODAY - timedelta(days=7 * (2 * poll + house % 2) + 2)
            figures = 100 * rng.multinomial(1000, finds) / 1000
            label = mode if with_modes else ""
            rows.append(
                f"House {house},{end - timedelta(days=2)},{end},{end},1000,{label},"
                + ",".join(f"{figure:.1f}" for figure in figures)
            )
    (folder / "polls.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    (folder / "contest.toml").write_text(_contest(), encoding="utf-8")
    (folder / "result_last.csv").write_text("region,HU,UP,OTH\nALL,40000,38000,22000\n", encoding="utf-8")
    return folder


def test_saying_how_houses_ask_moves_support_no_more_than_chance(tmp_path: Path) -> None:
    """Nine online houses and one telephone house six points lower, with the mode column and without.

    A mode is measured against the houses' mean mode. Were each mode one vote, the column alone would move
    support by two points and more.
    """
    found = {}
    for with_modes in (True, False):
        inputs = read_contest_folder(
            _write_ten_houses(tmp_path / str(with_modes), with_modes=with_modes), today=TODAY
        )
        draws = fit_contest(
            inputs, settings=RunSettings(seed=11, chains=2, draws=500), second_attempts=False
        ).draws
        assert ("mode" in draws.sizes) is with_modes
        found[with_modes] = 100 * np.stack(
            [
                draws["national_support"].isel(date=-1).mean(("chain", "draw")),
                draws["national_support_polling_day"].mean(("chain", "draw")),
            ]
        )
    # Three standard errors of the difference of two means at 1,000 effective draws, sd 2.5 points.
    np.testing.assert_allclose(found[True], found[False], atol=0.35)


# A poll of 5,000 in a country of 36 regions, entered whole, as eight groups of regions, or region by region.
REGIONS, RESPONDENTS = 36, 5000
KAPPA, RHO = 1.4, 0.0004


@dataclass(frozen=True)
class BigPoll:
    """Answers by region, and the last result; dims (region, party)."""

    answers: np.ndarray
    last: np.ndarray

    def write(self, folder: Path, *, rows: int) -> Path:
        """Write a contest whose register is this one poll, in some number of rows."""
        folder.mkdir()
        lines = ["poll,house,start,end,published,region,sample,HU,UP,OTH"]
        for group in np.array_split(np.arange(REGIONS), rows):
            counts = self.answers[group].sum(axis=0)
            where = "+".join(f"R{region:02d}" for region in group) if rows > 1 else ""
            figures = ",".join(f"{100 * count / counts.sum():.6f}" for count in counts)
            lines.append(
                f"big,Kestrel,{TODAY - timedelta(days=3)},{TODAY},{TODAY},{where},{counts.sum()},{figures}"
            )
        (folder / "polls.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
        # Without the shared lean, which would hide what the poll weighs.
        (folder / "contest.toml").write_text(
            _contest(regions=REGIONS, model="[model]\nshared_lean = false\nramp = false"), encoding="utf-8"
        )
        votes = [f"R{r:02d}," + ",".join(str(v) for v in self.last[r]) for r in range(REGIONS)]
        (folder / "result_last.csv").write_text("\n".join(["region,HU,UP,OTH", *votes, ""]), encoding="utf-8")
        return folder


def _draw_big_poll(rng: np.random.Generator) -> BigPoll:
    """Regions of very different size, each with its own strongholds, asked in proportion to their votes."""
    size = rng.dirichlet(np.full(REGIONS, 6.0))
    share = rng.dirichlet(40 * np.array([0.42, 0.36, 0.22]), size=REGIONS)
    last = np.round(1_000_000 * size[:, None] * share).astype(int)
    weight = last.sum(axis=1) / last.sum()
    people = np.floor(RESPONDENTS * weight).astype(int)
    people[np.argmax(people)] += RESPONDENTS - people.sum()
    moved = share * np.exp([0.1, -0.1, 0.0])
    moved /= moved.sum(axis=1, keepdims=True)
    deff = KAPPA + (RESPONDENTS - 1) * RHO
    answers = [
        rng.multinomial(n, rng.dirichlet((n - deff) / (deff - 1) * q))
        for n, q in zip(people, moved, strict=True)
    ]
    return BigPoll(answers=np.stack(answers), last=last)


def test_a_poll_of_5000_weighs_the_same_in_1_8_and_36_rows(tmp_path: Path) -> None:
    """Each row's variance is that of the whole poll's design effect, so effective respondents add up.

    For rows in proportion to votes the sum is exact; what remains is what differences between regions take
    out of sampling (under 3 %), and chance. Design effects are held fixed, or 36 rows would learn them.
    """
    poll, priors = _draw_big_poll(np.random.default_rng(3)), _fixed_design_effect()
    arrays = {
        rows: build_arrays(
            read_contest_folder(poll.write(tmp_path / str(rows), rows=rows), today=TODAY), priors=priors
        ).arrays
        for rows in (1, 8, 36)
    }
    assert {rows: len(a.rows.respondents) for rows, a in arrays.items()} == {1: 1, 8: 8, 36: 36}
    # Every row as a poll of its own: its respondents would be counted as if more had been asked.
    own = arrays[36]
    arrays[0] = replace(own, rows=replace(own.rows, poll_respondents=own.rows.respondents))
    with threadpool_limits(1):
        compiled = compile_election(arrays[36], priors=priors, shared_lean=False)
        fill = partial(compile_election, priors=priors, shared_lean=False, like=compiled)
        support = {rows: _support_today(fill(a)) for rows, a in arrays.items()}
    mean = {rows: s.mean(axis=0) for rows, s in support.items()}
    sd = {rows: s.std(axis=0) for rows, s in support.items()}
    for rows in (8, 36):
        np.testing.assert_allclose(mean[rows], mean[1], atol=0.2, err_msg=f"mean with {rows} rows")
        np.testing.assert_allclose(sd[rows], sd[1], rtol=0.1, err_msg=f"sd with {rows} rows")
    # What a survey textbook says of one poll (Kish 1965): √(p(1 − p) deff / n).
    share, deff = mean[1] / 100, KAPPA + (RESPONDENTS - 1) * RHO
    textbook = 100 * np.sqrt(share * (1 - share) * deff / RESPONDENTS)
    np.testing.assert_allclose(sd[1], textbook, rtol=0.12, err_msg="sd of one row against the textbook")
    assert (sd[0] < 0.85 * sd[1]).all(), "the check would not see rows counted as polls of their own"


def _fixed_design_effect() -> Priors:
    return Priors(
        weighting_loss_log_sd=1e-3,
        weighting_loss_spread=1e-3,
        error_floor_log_sd=1e-3,
        error_floor_spread=1e-3,
    )


def _support_today(election: CompiledElection) -> np.ndarray:
    """Draws of national support in percent, turnout as last time, dims (sample, party)."""
    parameters, _ = election.sample(
        ChainPlan(chains=2, tune=200, draws=600, seed=5), progress=lambda _part: None
    )
    arrays: ElectionArrays = election.arrays
    regional = support_of_regions(
        parameters,
        arrays=arrays,
        calendar=_calendar(),
        region_lean=np.zeros((len(parameters.kappa), *arrays.country.standing.shape)),
    )[:, 0]
    return 100 * np.einsum("r,srp->sp", arrays.country.turnout, regional)


def _calendar() -> Calendar:
    return Calendar(dates=pd.DatetimeIndex([TODAY]), voting=(POLLING_DAY,) * REGIONS, jolts={})
