"""Which way houses, eras, modes and populations lean, in shares of today's support."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from aggregator.estimate.parameters import Parameters
from models.arrays import ElectionArrays, Floats
from models.dimensions import ERA, FORMATION, HOUSE, MODE, PARTY, POPULATION
from models.lean_terms import lean_contrast, term_starts
from models.priors import Priors

Variables = dict[str, tuple[tuple[str, ...], Any]]


def summarise_leans(
    parameters: Parameters, *, arrays: ElectionArrays, eras: pd.DataFrame, national: Floats, priors: Priors
) -> tuple[Variables, Variables]:
    """Leans in share units at given national support.

    A house's lean is what it prints in its latest era less what the average house prints; an era's the same
    with its own terms. ``own`` leans leave mode and population out.

    Parameters
    ----------
    eras
        From :func:`aggregator.estimate.lean_terms_of_rows.list_eras`.
    national
        National support, dims (sample, party).

    Returns
    -------
    Variables per draw (their dims without sample), and variables that are the same in every draw.
    """
    own, whole = _era_terms(arrays, eras)
    latest = eras.groupby("house", sort=False)["last"].idxmax().to_numpy()
    printed = _printed(parameters, whole, national)
    average = printed[:, latest].mean(axis=1, keepdims=True)
    printed_own = _printed(parameters, own, national)
    drawn: Variables = {
        "era_lean": ((ERA, PARTY), printed - average),
        "era_own_lean": (
            (ERA, PARTY),
            printed_own - printed_own[:, latest].mean(axis=1, keepdims=True),
        ),
        "house_lean": ((HOUSE, PARTY), printed[:, latest] - average),
    }
    fixed: Variables = {
        "era_house": ((ERA,), eras["house"].to_numpy(object)),
        "era_method": ((ERA,), eras["method"].to_numpy(object)),
        "era_mode": ((ERA,), eras["mode"].to_numpy(object)),
        "era_population": ((ERA,), eras["population"].to_numpy(object)),
        "era_polls": ((ERA,), eras["polls"].to_numpy()),
        "era_usual_sample": ((ERA,), eras["usual_sample"].to_numpy()),
        "era_last": ((ERA,), pd.to_datetime(eras["last"]).to_numpy()),
    }
    _add_kinds(drawn, fixed, parameters, arrays=arrays, eras=eras, national=national, priors=priors)
    return drawn, fixed


def era_labels(eras: pd.DataFrame) -> list[str]:
    """One label per era: the house, and its method where it gives one."""
    return [
        f"{house} · {method}" if method else house
        for house, method in zip(eras["house"], eras["method"], strict=True)
    ]


def _era_terms(arrays: ElectionArrays, eras: pd.DataFrame) -> tuple[np.ndarray, np.ndarray]:
    """Terms of each era: its own, and with its usual mode and population; dims (era, slot)."""
    leans, houses = arrays.leans, arrays.rows.houses
    start = term_starts(leans, houses=len(houses))
    none = start["none"]
    era_place = {label: start["era"] + i for i, label in enumerate(leans.eras)}
    mode_place = {label: start["mode"] + i for i, label in enumerate(leans.modes)}
    population_place = {label: start["population"] + i for i, label in enumerate(leans.populations)}
    own, whole = [], []
    for house, method, mode, population in eras[["house", "method", "mode", "population"]].to_numpy(str):
        terms = [houses.index(house), era_place.get(f"{house}, {method}", none)]
        own.append(terms)
        whole.append([*terms, mode_place.get(mode, none), population_place.get(population, none)])
    return np.array(own), np.array(whole)


def _printed(parameters: Parameters, terms: np.ndarray, national: Floats) -> Floats:
    """Shares that leans make of national support, dims (sample, line, party)."""
    printed = national[:, None, :] * np.exp(parameters.terms[:, terms].sum(axis=2))
    return printed / printed.sum(axis=-1, keepdims=True)


def _add_kinds(
    drawn: Variables,
    fixed: Variables,
    parameters: Parameters,
    *,
    arrays: ElectionArrays,
    eras: pd.DataFrame,
    national: Floats,
    priors: Priors,
) -> None:
    """Add leans of modes, populations and formations, and how much of each the polls have told."""
    leans, houses = arrays.leans, len(arrays.rows.houses)
    start = term_starts(leans, houses=houses)
    learned = _learned(parameters, arrays=arrays, priors=priors)
    terms = leans.terms_of_row
    for kind, labels, dim in (
        ("mode", leans.modes, MODE),
        ("population", leans.populations, POPULATION),
        ("formation", leans.formations, FORMATION),
    ):
        if not labels:
            continue
        place = np.arange(start[kind], start[kind] + len(labels))
        lean = _printed(parameters, place[:, None], national) - national[:, None, :]
        rows = [(terms == number).any(axis=1) for number in place]
        fixed[f"{kind}_learned"] = ((dim, PARTY), learned[place])
        if kind != "formation":
            drawn[f"{kind}_lean"] = ((dim, PARTY), lean)
            fixed[f"{kind}_houses"] = ((dim,), [len(set(arrays.rows.house_of_row[r])) for r in rows])
            continue
        members = leans.formation_members
        drawn["formation_lean"] = ((dim,), np.einsum("sfp,fp->sf", lean, members))
        fixed["formation_learned"] = ((dim,), (learned[place] * members).sum(axis=1) / members.sum(axis=1))
        fixed["formation_polls"] = ((dim,), [len(set(arrays.rows.poll_of_row[r])) for r in rows])


def _learned(parameters: Parameters, *, arrays: ElectionArrays, priors: Priors) -> Floats:
    """Part of each term's prior variance that the polls took away, 0–1; dims (term, party)."""
    contrast = lean_contrast(arrays.leans, houses=len(arrays.rows.houses), priors=priors)
    prior = (contrast**2).sum(axis=1)[:, None] * (parameters.house_scale**2).mean(axis=0)
    left = parameters.terms[:, :-1].var(axis=0)
    return np.clip(1 - left / np.maximum(prior, 1e-300), 0, 1)
