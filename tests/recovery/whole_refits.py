"""Fit elections whose truth is known, and measure the errors in units of the stated uncertainty."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import numpy as np
import pandas as pd

from aggregator.estimate.fit import Fit, fit_contest
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.settings import RunSettings
from aggregator.studies.whitening import PooledErrors, pool_errors, whitened_errors
from data_demo.made_up_election import ElectionSize, MadeUpElection, simulate_election
from data_demo.made_up_folder import write_contest_folder

AFTER_THE_ELECTION = date(2100, 1, 1)


@dataclass(frozen=True)
class Recovered:
    """What one refit got right.

    Attributes
    ----------
    whitened
        Errors of polling-day support over all zero-sum coordinates of log support, in units of the posterior:
        standard normal where the model is right.
    national_inside, regional_inside
        Whether each 90 % interval for polling day holds the truth.
    house_z
        Errors of what each house, in each of its eras, prints beside the average one, over posterior sd.
    """

    whitened: np.ndarray
    national_inside: np.ndarray
    regional_inside: np.ndarray
    house_z: np.ndarray


@dataclass(frozen=True)
class Pooled(PooledErrors):
    """Refits taken together.

    Attributes
    ----------
    national, regional
        Part of the 90 % intervals that hold the truth.
    house_rms
        Root mean square of the house effects' z.
    """

    national: float
    regional: float
    house_rms: float

    def __str__(self) -> str:
        """One line for a study's log."""
        low, high = self.band
        return (
            f"chi-square {self.chi_square:.1f} on {self.degrees} (99 % band {low:.1f} to {high:.1f}); "
            f"90 % intervals hold the truth in {self.national:.1%} of national and {self.regional:.1%} of "
            f"regional cases; house effects rms z {self.house_rms:.2f}"
        )


def refit(
    seed: int, *, folder: Path, size: ElectionSize | None, lean_in_the_model: bool = True, draws: int = 500
) -> Recovered:
    """Simulate an election, write it as a desk would, read it, fit it, and compare with the truth."""
    election = simulate_election(seed, size=size)
    write_contest_folder(election, folder)
    if not lean_in_the_model:
        contest = folder / "contest.toml"
        contest.write_text(
            contest.read_text(encoding="utf-8") + "\n[model]\nshared_lean = false\n", encoding="utf-8"
        )
    inputs = read_contest_folder(folder, today=AFTER_THE_ELECTION)
    fit = fit_contest(inputs, settings=RunSettings(seed=seed, draws=draws), second_attempts=False)
    return compare(fit, election)


def pool(refits: Iterable[Recovered]) -> Pooled:
    """Take several refits together."""
    found = list(refits)
    errors = pool_errors(r.whitened for r in found)
    return Pooled(
        chi_square=errors.chi_square,
        degrees=errors.degrees,
        national=float(np.concatenate([r.national_inside for r in found]).mean()),
        regional=float(np.concatenate([r.regional_inside for r in found]).mean()),
        house_rms=float(np.sqrt((np.concatenate([r.house_z for r in found]) ** 2).mean())),
    )


def compare(fit: Fit, election: MadeUpElection) -> Recovered:
    """Hold a fit's draws against the truth of the election it was made from."""
    parties = fit.draws["party"].to_numpy()
    truth = election.truth.polling_day
    country = truth["region"].fillna("") == ""
    national = truth[country].set_index("code")["support"].reindex(parties).to_numpy() / 100
    regional = (
        truth[~country]
        .pivot(index="region", columns="code", values="support")
        .reindex(index=fit.draws["region"].to_numpy(), columns=parties)
        .to_numpy()
        / 100
    )
    effects = election.truth.houses.pivot(index=["house", "method"], columns="code", values="lean_points")
    eras = pd.MultiIndex.from_arrays(
        [fit.draws[name].to_numpy().astype(str) for name in ("era_house", "era_method")]
    )
    effects = effects.reindex(index=eras, columns=parties).to_numpy() / 100
    lean = fit.draws["era_lean"]
    house_z = ((effects - lean.mean(("chain", "draw"))) / lean.std(("chain", "draw"))).to_numpy()
    draws = fit.draws["national_support_polling_day"].to_numpy().reshape(-1, len(parties))
    counted = fit.arrays.counted
    known = [] if counted is None else counted.region
    # The count of a region is its votes, which stray from support as its seats do: nothing to be judged.
    stands = np.nan_to_num(regional) > 0
    stands[known] = False
    low, high = np.quantile(draws, [0.05, 0.95], axis=0)
    region_low, region_high = (
        fit.draws["support_polling_day"].quantile([0.05, 0.95], ("chain", "draw")).to_numpy()
    )
    return Recovered(
        whitened=whitened_errors(draws, national),
        national_inside=(low <= national) & (national <= high),
        regional_inside=((region_low <= regional) & (regional <= region_high))[stands],
        house_z=house_z[np.isfinite(house_z)],
    )
