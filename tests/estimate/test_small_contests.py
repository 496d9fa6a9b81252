"""The smallest contests a desk can have fit, and say no more than their polls bear."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from pathlib import Path

import numpy as np
import pytest

from aggregator.estimate.fit import Fit, fit_contest
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.settings import RunSettings
from models.priors import Priors

TODAY = date(2031, 5, 2)
SAMPLE = 1000
SETTINGS = RunSettings(draws=300, chains=2)
# A posterior mean further from the mean of the polls than this many points has left them.
NEAR = 5.0

POLLS_OF = {
    "HU": (41, 40, 42, 41, 43, 42),
    "UP": (35, 37, 36, 34, 35, 36),
    "OL": (18, 17, 17, 19, 16, 17),
}
DAYS = ("02-20", "03-06", "03-20", "04-03", "04-14", "04-26")
HOUSES = ("Tarrow Research", "Kestrel Poll")
RESULT = """\
seat,name,region,HU,UP,OL,OTH
N1,Northgate,NORTH,4500,3100,1500,500
N2,Pier Head,NORTH,4200,3600,1400,400
M1,Mereside,MERE,3600,4100,1900,600
M2,Old Orchard,MERE,3300,3500,2600,500
"""


@dataclass(frozen=True)
class SmallContest:
    """What a contest has; by default as little as it can, and otherwise what the fields say."""

    parties: tuple[str, ...] = ("HU", "UP")
    regions: tuple[str, ...] = ()
    houses: int = 1
    polls: int = 3
    others: bool = False
    last_result: bool = False

    def write(self, folder: Path) -> Path:
        """Write the contest folder."""
        folder.mkdir()
        (folder / "contest.toml").write_text(self._contest(), encoding="utf-8")
        (folder / "polls.csv").write_text(self._register(), encoding="utf-8")
        if self.last_result:
            (folder / "result_last.csv").write_text(self._result(), encoding="utf-8")
        return folder

    def shares(self) -> np.ndarray:
        """Shares of the polls among those who chose, others last; dims (poll, party)."""
        shown = np.array([POLLS_OF[party][-self.polls :] for party in self.parties], dtype=float).T
        if self.others:
            return np.column_stack([shown, 100 - shown.sum(axis=1)]) / 100
        return shown / shown.sum(axis=1, keepdims=True)

    def _contest(self) -> str:
        lines = ['title = "Assembly"', "polling_day = 2031-05-18", f"others = {str(self.others).lower()}"]
        for party in self.parties:
            lines += ["[[party]]", f'code = "{party}"', f'name = "Party {party}"']
        for region in self.regions:
            lines += ["[[region]]", f'code = "{region}"', f'name = "Region {region}"', "electorate = 50000"]
        if self.last_result:
            lines += ["[last_result]", "date = 2027-05-16"]
        return "\n".join([*lines, "[counting]", 'rule = "none"', ""])

    def _register(self) -> str:
        rows = [f"house,start,end,published,sample,{','.join(self.parties)}"]
        shares = 100 * self.shares()[:, : len(self.parties)]
        for at, (day, shown) in enumerate(zip(DAYS[-self.polls :], shares, strict=True)):
            when = f"2031-{day}"
            figures = ",".join(f"{figure:.1f}" for figure in shown)
            rows.append(f"{HOUSES[at % self.houses]},{when},{when},{when},{SAMPLE},{figures}")
        return "\n".join([*rows, ""])

    def _result(self) -> str:
        rows = [line.split(",") for line in RESULT.splitlines()]
        head = rows[0]
        kept = [head.index(c) for c in ("seat", "name", "region", *self.parties)]
        kept += [head.index("OTH")] if self.others else []
        if not self.regions:
            kept.remove(head.index("region"))
        return "\n".join([*(",".join(row[i] for i in kept) for row in rows), ""])


THREE = ("HU", "UP", "OL")
TWO_REGIONS = ("NORTH", "MERE")
CONTESTS = {
    "one region": SmallContest(THREE, (), houses=2, polls=6, others=True, last_result=True),
    "one house": SmallContest(THREE, TWO_REGIONS, houses=1, polls=6, others=True, last_result=True),
    "a referendum with three polls": SmallContest(houses=2, last_result=True),
    "no last result": SmallContest(THREE, TWO_REGIONS, houses=2, polls=6, others=True),
    "everything at its smallest": SmallContest(),
}


@dataclass(frozen=True)
class Fitted:
    contest: SmallContest
    fit: Fit


@pytest.fixture(scope="module", params=CONTESTS, ids=lambda name: name.replace(" ", "_"))
def fitted(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Fitted:
    contest = CONTESTS[request.param]
    folder = contest.write(tmp_path_factory.mktemp("small") / "contest")
    inputs = read_contest_folder(folder, today=TODAY)
    return Fitted(contest, fit_contest(inputs, settings=SETTINGS, second_attempts=False))


def test_the_sampler_follows_the_posterior_everywhere(fitted: Fitted) -> None:
    assert fitted.fit.convergence.divergences == 0


def test_every_published_quantity_is_a_number(fitted: Fitted) -> None:
    for name, variable in fitted.fit.draws.data_vars.items():
        assert np.isfinite(variable).all(), name


def test_shares_sum_to_one_in_every_draw(fitted: Fitted) -> None:
    draws = fitted.fit.draws
    for name in ("support", "support_polling_day", "national_support", "national_support_polling_day"):
        np.testing.assert_allclose(draws[name].sum("party"), 1, atol=1e-5, err_msg=name)
        assert float(draws[name].min()) >= 0


def test_estimates_stay_near_the_polls(fitted: Fitted) -> None:
    polled = 100 * fitted.contest.shares().mean(axis=0)
    for name in ("national_support", "national_support_polling_day"):
        support = fitted.fit.draws[name]
        support = support.isel(date=-1) if "date" in support.dims else support
        estimate = 100 * support.mean(("chain", "draw")).to_numpy()
        assert np.abs(estimate - polled).max() < NEAR, name


def test_polling_day_is_less_sure_than_a_sample_of_all_the_polls(fitted: Fitted) -> None:
    share = fitted.contest.shares().mean(axis=0)
    sampling = np.sqrt(share * (1 - share) / (SAMPLE * fitted.contest.polls))
    support = fitted.fit.draws["national_support_polling_day"]
    low, high = (support.quantile(q, ("chain", "draw")).to_numpy() for q in (0.05, 0.95))
    assert (high - low > 2 * 1.645 * sampling).all()
    # Nearly all of the lean that houses may share is left, however many polls agree.
    lean = Priors().shared_lean * np.sqrt(share * (1 - share))
    assert (support.std(("chain", "draw")).to_numpy() > 0.8 * lean).all()
    # Wide, but not as if nobody had been asked.
    assert (high - low).max() < 0.4


def test_house_leans_sum_to_zero_and_one_house_has_none(fitted: Fitted) -> None:
    lean = fitted.fit.draws["house_lean"]
    np.testing.assert_allclose(lean.sum("house"), 0, atol=1e-6)
    assert (float(np.abs(lean).max()) == 0) == (fitted.contest.houses == 1)
