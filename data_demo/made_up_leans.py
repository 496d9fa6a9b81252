"""What makes a house's figures differ: itself, its method, its mode, whom it asks and how; and its noise."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from data_demo.made_up_country import Country
from data_demo.made_up_scenery import TARGET_POPULATION
from data_demo.made_up_schedule import Visit, mode_shares

TAU_AT_15_PERCENT = 0.06
"""Log sd between houses for a party of 15 %."""
TAU_NOISE = 0.3
ERA_RATIO = 0.5
MODE_RATIO = 0.7
POPULATION_RATIO = 0.7
FORMATION_RATIO = 0.7


@dataclass(frozen=True)
class HouseTruth:
    """What is true of the houses and no poll prints. Effects and leans are log points.

    Attributes
    ----------
    effect
        House effects, dims (house, party), drawn independently: their mean is part of what all polls share.
    effect_scale
        Sd the effects were drawn with, dims (party,).
    kappa, rho
        Design effect at size N is kappa + (N - 1) rho, dims (house,).
    era_effect
        By house: what its method in each era adds to its effect, dims (era, party), mean zero.
    mode_lean
        By mode, dims (party,); mean zero over houses, each by its share of polls in the mode.
    population_lean
        By population other than the target, dims (party,).
    formation_lean
        By alliance, dims (party,): what asking about it as one figure adds.
    """

    effect: np.ndarray
    effect_scale: np.ndarray
    kappa: np.ndarray
    rho: np.ndarray
    era_effect: tuple[np.ndarray, ...]
    mode_lean: dict[str, np.ndarray]
    population_lean: dict[str, np.ndarray]
    formation_lean: dict[str, np.ndarray]

    def design_effect(self, house: int, *, respondents: float) -> float:
        """Design effect of one house at one size of the whole poll."""
        return float(self.kappa[house] + (respondents - 1) * self.rho[house])

    def own_effect(self, house: int, *, era: int) -> np.ndarray:
        """Effect of a house in an era, its mode and population left out, dims (party,)."""
        return self.effect[house] + self.era_effect[house][era]

    def whole_effect(
        self, house: int, *, era: int, mode: str, population: str, together: Iterable[str] = ()
    ) -> np.ndarray:
        """Everything that makes a poll's figures differ, dims (party,).

        Parameters
        ----------
        together
            Alliances that the poll asks about as one figure.
        """
        none = np.zeros_like(self.effect_scale)
        total = self.own_effect(house, era=era)
        total = total + self.mode_lean.get(mode, none) + self.population_lean.get(population, none)
        return total + sum((self.formation_lean.get(code, none) for code in together), start=none)


def draw_house_truth(country: Country, *, schedule: list[Visit], rng: np.random.Generator) -> HouseTruth:
    """Draw house effects, design effects, and the leans that the scenery asks for."""
    scenery, shares = country.scenery, country.last_shares
    houses = len(scenery.houses)
    scale = TAU_AT_15_PERCENT * np.sqrt(0.15 / shares) * np.exp(TAU_NOISE * rng.normal(size=shares.size))
    kappa_centre, rho_centre = rng.normal(np.log(0.4), 0.4), rng.normal(np.log(0.0004), 0.7)
    effect = scale * rng.normal(size=(houses, shares.size))
    kappa = 1 + np.exp(kappa_centre + 0.4 * rng.normal(size=houses))
    rho = np.exp(rho_centre + 0.5 * rng.normal(size=houses))
    # A generator for each kind: one switched on leaves the others as they were.
    era_rng, mode_rng, population_rng, formation_rng = rng.spawn(4)
    populations = sorted({h.population for h in scenery.houses} - {TARGET_POPULATION})
    alliances = [a.code for a in scenery.alliances]
    return HouseTruth(
        effect=effect,
        effect_scale=scale,
        kappa=kappa,
        rho=rho,
        era_effect=tuple(
            _centred_eras(len(house.methods), scale=ERA_RATIO * scale, rng=era_rng)
            for house in scenery.houses
        ),
        mode_lean=(
            _centred_modes(mode_shares(schedule), scale=MODE_RATIO * scale, rng=mode_rng)
            if scenery.mode_leans
            else {}
        ),
        population_lean=_plain(
            populations if scenery.population_leans else [],
            scale=POPULATION_RATIO * scale,
            rng=population_rng,
        ),
        formation_lean=_plain(
            alliances if scenery.formation_leans else [], scale=FORMATION_RATIO * scale, rng=formation_rng
        ),
    )


def _centred_eras(eras: int, *, scale: np.ndarray, rng: np.random.Generator) -> np.ndarray:
    drawn = scale * rng.normal(size=(eras, scale.size))
    return drawn - drawn.mean(axis=0)


def _centred_modes(
    shares: dict[str, float], *, scale: np.ndarray, rng: np.random.Generator
) -> dict[str, np.ndarray]:
    drawn = scale * rng.normal(size=(len(shares), scale.size))
    drawn -= np.array(list(shares.values())) @ drawn
    return dict(zip(shares, drawn, strict=True))


def _plain(labels: list[str], *, scale: np.ndarray, rng: np.random.Generator) -> dict[str, np.ndarray]:
    return dict(zip(labels, scale * rng.normal(size=(len(labels), scale.size)), strict=True))
