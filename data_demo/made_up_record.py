"""The record of polling errors at past elections of an invented country."""

from __future__ import annotations

import numpy as np
import pandas as pd

from data_demo.made_up_country import Country, softmax
from data_demo.made_up_scenery import OTHERS

PAST_SPREAD = 0.2
"""Log sd of a party's share at a past election about its usual one."""


def draw_past_errors(country: Country, *, shared_lean: bool, rng: np.random.Generator) -> pd.DataFrame:
    """Record of final poll averages at past elections, columns election, code, polled, result (percent).

    Their errors follow the law of the shared lean without the undecided. That of the last election is the
    one the polls then had; a party that has dissolved since then counts as others.
    """
    scenery = country.scenery
    known = np.array([not p.is_new for p in scenery.parties] + [True])
    codes = np.array(scenery.codes)[known]
    scale = country.lean_scale[known] * np.sqrt(country.last_shares[known])
    frames = []
    for day in scenery.past_elections:
        if day == scenery.last_election:
            result = _last_result(country, codes=codes)
            error = (country.weights @ (country.lean[0] - country.undecided_lean[0]))[known]
        else:
            usual = [p.usual_share for p in scenery.parties if not p.is_new]
            usual.append(scenery.others_share + (scenery.dissolved or ("", 0.0))[1])
            result = softmax(np.log(usual) + PAST_SPREAD * rng.normal(size=codes.size))
            error = scale / np.sqrt(result) * rng.normal(size=codes.size)
        if not shared_lean:
            error = np.zeros_like(error)
        polled = softmax(np.log(result) + error)
        frames.append(
            pd.DataFrame(
                {"election": str(day), "code": codes, "polled": 100 * polled, "result": 100 * result}
            )
        )
    if not frames:
        return pd.DataFrame(columns=["election", "code", "polled", "result"])
    return pd.concat(frames, ignore_index=True).round({"polled": 1, "result": 1})


def _last_result(country: Country, *, codes: np.ndarray) -> np.ndarray:
    votes = country.last_votes.drop(columns=["seat", "name", "region"]).sum()
    shares = votes.reindex(codes) / votes.sum()
    shares[OTHERS] += 1 - shares.sum()
    return shares.to_numpy()
