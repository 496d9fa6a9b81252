"""A small posterior, made up in plain numpy: a valid set of draws for tests that need no fit.

The country, its parties and its houses are invented. The numbers obey the same definitions as those of a
real fit (shares sum to one, an absent party has none, variances follow from the log-ratio scales), but no
code of the project computes them.
"""

from __future__ import annotations

from datetime import date, timedelta

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest

RUN_DATE = date(2033, 3, 6)
POLLING_DAY = date(2033, 5, 15)

_REGION_WEIGHTS = {"SKERRY": 0.2, "DOWNS": 0.35, "PORT": 0.45}
_REGION_SHARES = {
    "SKERRY": {"FER": 0.46, "LAN": 0.38, "HED": 0.0, "TID": 0.0, "OTH": 0.16},
    "DOWNS": {"FER": 0.34, "LAN": 0.26, "HED": 0.31, "TID": 0.0, "OTH": 0.09},
    "PORT": {"FER": 0.39, "LAN": 0.44, "HED": 0.08, "TID": 0.0, "OTH": 0.09},
}
_HOUSES = {
    "Plumb Line": (12, 1050),
    "Saltbox Surveys": (7, 800),
    "Tally & Wick": (9, 1500),
    "Weathercock": (2, 600),
}
# House, label of its way of working, usual mode, usual population, polls, days before the run of its last.
_ERAS = (
    ("Plumb Line", "", "telephone", "voters", 12, 3),
    ("Saltbox Surveys", "door to door", "face_to_face", "voters", 3, 61),
    ("Saltbox Surveys", "panel 2032", "online", "voters", 4, 5),
    ("Tally & Wick", "", "online", "adults", 9, 8),
    ("Weathercock", "", "telephone", "voters", 2, 20),
)
_MODES = {"face_to_face": 1, "online": 2, "telephone": 2}
_RAMP_DAYS = 60
_CLOCK_DAYS_BACK = 90
_DRIFT_SD_LOG = 0.035  # per root of a week, for a party at 15 %
_HOUSE_SD_LOG = 0.06  # for a party at 15 %
_SHARED_LEAN_C = 0.025 / np.sqrt(0.24)  # 2.5 points at 40 %
_USUAL_SHARE = 0.15


def made_up_contest() -> Contest:
    """An invented contest: three regions, four parties and others, one alliance, one newcomer.

    ``HED`` does not stand in ``SKERRY``; ``TID`` has no last votes anywhere.
    """
    return Contest.model_validate(
        {
            "title": "Council of the Saltmarsh Isles 2033",
            "polling_day": POLLING_DAY,
            "party": [
                {"code": "FER", "name": "Ferry Party"},
                {"code": "LAN", "name": "Lantern Union"},
                {"code": "HED", "name": "Hedge League", "regions": ("DOWNS", "PORT")},
                {"code": "TID", "name": "New Tide"},
            ],
            "alliance": [{"code": "GLOW", "name": "Glow Pact", "members": ("LAN", "HED")}],
            "region": [
                {"code": "SKERRY", "name": "The Skerries"},
                {"code": "DOWNS", "name": "Upper Downs"},
                {"code": "PORT", "name": "Port and Quays"},
            ],
            "last_result": {"date": date(2029, 5, 13)},
        }
    )


def made_up_last_result(*, seed: int = 1, seats_per_region: int = 8) -> pd.DataFrame:
    """Votes at the last election, one row per seat: ``seat, name, region``, one column per code.

    One seat of ``PORT`` has no candidate of ``HED``.
    """
    rng = np.random.default_rng(seed)
    codes = made_up_contest().party_codes
    rows = []
    for region, shares in _REGION_SHARES.items():
        for number in range(1, seats_per_region + 1):
            strength = np.array([shares[c] for c in codes]) * np.exp(rng.normal(0, 0.35, len(codes)))
            total = _REGION_WEIGHTS[region] * 100_000 / seats_per_region * rng.uniform(0.8, 1.2)
            votes = np.round(total * strength / strength.sum())
            if region == "PORT" and number == 1:
                votes[codes.index("HED")] = 0
            rows.append([f"{region[:2]}{number:02d}", f"{region.title()} {number}", region, *votes])
    return pd.DataFrame(rows, columns=["seat", "name", "region", *codes])


def made_up_draws(
    *,
    seed: int = 1,
    chains: int = 2,
    draws: int = 100,
    dates: int = 5,
) -> xr.Dataset:
    """Draws of support, leans and scales for the invented contest; the last date is the run date.

    Parameters
    ----------
    seed
        Seed of every number.
    chains, draws
        Shape of the posterior.
    dates
        Number of weekly dates, the run date last.
    """
    rng = np.random.default_rng(seed)
    contest = made_up_contest()
    parties, regions, houses = contest.party_codes, contest.region_codes, tuple(_HOUSES)
    size = (chains, draws)
    n_parties, n_regions, n_houses = len(parties), len(regions), len(houses)

    share_last = np.array([[_REGION_SHARES[r][c] for c in parties] for r in regions])
    stands = np.array([[contest.stands_in(c, r) for c in parties] for r in regions])
    share_guess = np.where(share_last > 0, share_last, 0.05)
    baseline = np.where(stands, np.log(share_guess), -np.inf)

    typical = np.sqrt(_USUAL_SHARE / np.average(share_guess, axis=0, weights=list(_REGION_WEIGHTS.values())))
    drift_sd_log = _DRIFT_SD_LOG * typical * np.exp(rng.normal(0, 0.2, (*size, n_parties)))
    house_sd_log = _HOUSE_SD_LOG * typical * np.exp(rng.normal(0, 0.2, (*size, n_parties)))
    path = _path(rng, (*size, dates), n_parties, drift_sd_log)
    regional = 0.5 * _path(rng, (*size, dates), n_parties * n_regions, None).reshape(
        *size, dates, n_regions, n_parties
    )
    regional *= drift_sd_log[:, :, None, None, :]
    centre = rng.normal(0, 0.05, (*size, 1, 1, n_parties))
    log_ratio = baseline + centre + path[..., None, :] + regional
    weeks_left = (POLLING_DAY - RUN_DATE).days / 7
    step = rng.normal(size=(*size, n_regions, n_parties)) * 0.5 + rng.normal(size=(*size, 1, n_parties))
    log_ratio_polling_day = log_ratio[:, :, -1] + step * drift_sd_log[:, :, None, :] * np.sqrt(weeks_left)

    support = _softmax(log_ratio)
    support_polling_day = _softmax(log_ratio_polling_day)
    weight = np.array([_REGION_WEIGHTS[r] for r in regions]) * np.exp(rng.normal(0, 0.04, (*size, n_regions)))
    weight /= weight.sum(axis=-1, keepdims=True)
    national = np.einsum("cdr,cdtrp->cdtp", weight, support)
    national_polling_day = np.einsum("cdr,cdrp->cdp", weight, support_polling_day)

    today = national[:, :, -1]
    lean_log = rng.normal(size=(*size, n_houses, n_parties)) * house_sd_log[:, :, None, :]
    lean_log -= lean_log.mean(axis=2, keepdims=True)
    own_log = np.stack([lean_log[:, :, houses.index(era[0])] for era in _ERAS], axis=2)
    own_log += 0.5 * house_sd_log[:, :, None, :] * rng.normal(size=(1, 1, len(_ERAS), n_parties))
    mode_log = 0.7 * house_sd_log[:, :, None, :] * rng.normal(size=(*size, len(_MODES), n_parties))
    mode_log -= np.average(mode_log, axis=2, weights=list(_MODES.values()))[:, :, None]
    population_log = 0.7 * house_sd_log[:, :, None, :] * rng.normal(size=(*size, 1, n_parties))
    era_log = own_log + np.stack([mode_log[:, :, list(_MODES).index(era[2])] for era in _ERAS], axis=2)
    era_log += population_log * np.array([era[3] == "adults" for era in _ERAS])[:, None]
    era_lean, mode_lean = _in_shares(era_log, today), _in_shares(mode_log, today)
    latest = {era[0]: place for place, era in enumerate(_ERAS)}
    house_lean = era_lean[:, :, [latest[house] for house in houses]]
    kappa = 1 + np.exp(rng.normal(np.log(0.4), 0.2, (*size, n_houses)))
    rho = np.exp(rng.normal(np.log(0.0004), 0.3, (*size, n_houses)))
    usual_sample = np.array([_HOUSES[h][1] for h in houses])
    mean_today = today.mean(axis=(0, 1))
    shared_lean_sd_log = _SHARED_LEAN_C / np.sqrt(mean_today)

    clock_days, ramp_log_height, clock = _opinion_clock(rng, size)

    days = [RUN_DATE - timedelta(weeks=dates - 1 - i) for i in range(dates)]
    per_draw = ("chain", "draw")
    return xr.Dataset(
        {
            "support": ((*per_draw, "date", "region", "party"), support.astype(np.float32)),
            "support_polling_day": ((*per_draw, "region", "party"), support_polling_day.astype(np.float32)),
            "turnout_weight": ((*per_draw, "region"), weight),
            "national_support": ((*per_draw, "date", "party"), national),
            "national_support_polling_day": ((*per_draw, "party"), national_polling_day),
            "house_lean": ((*per_draw, "house", "party"), house_lean),
            "design_effect": ((*per_draw, "house"), kappa + (usual_sample - 1) * rho),
            "usual_sample": (("house",), usual_sample),
            "poll_count": (("house",), np.array([_HOUSES[h][0] for h in houses])),
            "kappa": ((*per_draw, "house"), kappa),
            "rho": ((*per_draw, "house"), rho),
            "drift_sd_log": ((*per_draw, "party"), drift_sd_log),
            "drift_variance": ((*per_draw, "party"), _share_variance(today, drift_sd_log)),
            "house_sd_log": ((*per_draw, "party"), house_sd_log),
            "house_lean_sd": ((*per_draw, "party"), np.sqrt(_share_variance(today, house_sd_log))),
            "shared_lean_sd_log": (("party",), shared_lean_sd_log),
            "shared_lean_sd": (("party",), np.sqrt(_share_variance(mean_today, shared_lean_sd_log))),
            "era_lean": ((*per_draw, "era", "party"), era_lean),
            "era_own_lean": ((*per_draw, "era", "party"), _in_shares(own_log, today)),
            "mode_lean": ((*per_draw, "mode", "party"), mode_lean),
            "mode_learned": (("mode", "party"), np.linspace(0.05, 0.75, 3 * n_parties).reshape(3, -1)),
            "population_lean": ((*per_draw, "population", "party"), _in_shares(population_log, today)),
            "population_learned": (("population", "party"), np.full((1, n_parties), 0.4)),
            "formation_lean": ((*per_draw, "formation"), rng.normal(0.006, 0.004, (*size, 1))),
            "formation_learned": (("formation",), np.array([0.65])),
            "opinion_clock": ((*per_draw, "day"), clock),
            "ramp_log_height": (per_draw, ramp_log_height),
        },
        coords={
            "chain": np.arange(chains),
            "draw": np.arange(draws),
            "date": pd.DatetimeIndex(days),
            "region": list(regions),
            "party": list(parties),
            "house": list(houses),
            "era": [f"{house} · {label}" if label else house for house, label, *_ in _ERAS],
            "era_house": ("era", [era[0] for era in _ERAS]),
            "era_method": ("era", [era[1] for era in _ERAS]),
            "era_mode": ("era", [era[2] for era in _ERAS]),
            "era_population": ("era", [era[3] for era in _ERAS]),
            "era_polls": ("era", [era[4] for era in _ERAS]),
            "era_last": ("era", pd.DatetimeIndex([RUN_DATE - timedelta(days=era[5]) for era in _ERAS])),
            "mode": list(_MODES),
            "mode_houses": ("mode", list(_MODES.values())),
            "population": ["adults"],
            "population_houses": ("population", [1]),
            "formation": [alliance.code for alliance in contest.alliances],
            "formation_polls": ("formation", [6]),
            "day": clock_days,
        },
        attrs={"run_date": RUN_DATE.isoformat(), "polling_day": POLLING_DAY.isoformat(), "seed": seed},
    )


def rename_houses(draws: xr.Dataset, names: dict[str, str]) -> xr.Dataset:
    """The same draws, with other names for some houses and their eras."""
    houses = [names.get(str(house), str(house)) for house in draws["house"].values]
    era_houses = [names.get(str(house), str(house)) for house in draws["era_house"].values]
    labels = draws["era_method"].values
    eras = [f"{house} · {label}" if label else house for house, label in zip(era_houses, labels, strict=True)]
    return draws.assign_coords(house=houses, era=eras, era_house=("era", era_houses))


def only_houses(draws: xr.Dataset, houses: list[str]) -> xr.Dataset:
    """The draws of some houses alone."""
    return draws.sel(house=houses).isel(era=draws["era_house"].isin(houses).values)


def calendar_clock(draws: xr.Dataset) -> xr.Dataset:
    """The same draws, with opinion time that runs with the calendar from first to last."""
    weeks = (draws["day"] - draws["day"][0]) / np.timedelta64(7, "D")
    return draws.assign(opinion_clock=xr.zeros_like(draws["opinion_clock"]) + weeks)


def _opinion_clock(
    rng: np.random.Generator, size: tuple[int, int]
) -> tuple[pd.DatetimeIndex, np.ndarray, np.ndarray]:
    """Days, log height of the ramp, and opinion weeks since the first day: it may race or rest at the end."""
    days = pd.date_range(RUN_DATE - timedelta(days=_CLOCK_DAYS_BACK), POLLING_DAY)
    height = rng.normal(0, 0.5, size)
    left = (pd.Timestamp(POLLING_DAY) - days[1:]).days + 0.5
    rise = np.clip(1 - left.to_numpy() / _RAMP_DAYS, 0, 1)
    pace = np.exp(height[..., None] * rise) / 7
    return days, height, np.concatenate([np.zeros((*size, 1)), pace.cumsum(axis=-1)], axis=-1)


def _in_shares(log_lean: np.ndarray, share: np.ndarray) -> np.ndarray:
    """First-order lean in share units at ``share``; dims (chain, draw, …, party)."""
    mean = np.einsum("cdhp,cdp->cdh", log_lean, share)[..., None]
    return share[:, :, None] * (log_lean - mean)


def _path(
    rng: np.random.Generator, shape: tuple[int, int, int], columns: int, sd: np.ndarray | None
) -> np.ndarray:
    """Weekly random walks that start at zero: shape (chain, draw, date, column)."""
    steps = rng.normal(size=(*shape, columns))
    steps[:, :, 0] = 0
    if sd is not None:
        steps *= sd[:, :, None, :]
    return np.cumsum(steps, axis=2)


def _softmax(log_ratio: np.ndarray) -> np.ndarray:
    strength = np.exp(log_ratio)
    return strength / strength.sum(axis=-1, keepdims=True)


def _share_variance(share: np.ndarray, sd_log: np.ndarray) -> np.ndarray:
    """Variance of each share when every party's log-ratio moves on its own with ``sd_log``."""
    variance = sd_log**2
    everyone = (variance * share**2).sum(axis=-1, keepdims=True)
    return share**2 * (variance * (1 - 2 * share) + everyone)
