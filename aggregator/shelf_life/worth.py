"""What polls are worth as they age, from the draws of a fit.

All numbers are computed draw by draw in closed form and summarised last, so that they carry the fit's
uncertainty about how fast opinion moves.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import OTHERS, Alliance
from aggregator.shelf_life.ageing import fresh_worth, half_life_weeks, share_variance
from aggregator.shelf_life.opinion_clock import age_in_days, weeks_between
from models.dimensions import CHAIN, DATE, DRAW, HOUSE, PARTY, POLL

FloatArray = npt.NDArray[np.float64]

POINTS = 100.0
# The interval of every published table.
LOWER, UPPER = 0.05, 0.95
# Every day of a quarter of a year.
USUAL_AGES = tuple(range(91))
_AGE = "age_days"
_DRAWS = (CHAIN, DRAW)


@dataclass(frozen=True)
class Code:
    """A party or an alliance: its code, its level and the parties that are summed."""

    code: str
    level: str
    members: tuple[str, ...]


def codes_of(draws: xr.Dataset, *, alliances: Iterable[Alliance] = ()) -> list[Code]:
    """All parties, others included, then the alliances."""
    parties = [str(p) for p in draws[PARTY].values]
    codes = [Code(p, "others" if p == OTHERS else "party", (p,)) for p in parties]
    return codes + [Code(a.code, "alliance", a.members) for a in alliances]


def headline_code(draws: xr.Dataset) -> str:
    """Code of the largest party on the run date by mean national support; others are no party."""
    support = _support_today(draws).mean(_DRAWS)
    named = support.sel({PARTY: support[PARTY] != OTHERS})
    return str(named.idxmax(PARTY).item())


def summarise_shelf_life(
    draws: xr.Dataset,
    *,
    sample: int = 1000,
    ages: Sequence[float] = USUAL_AGES,
    alliances: Iterable[Alliance] = (),
) -> pd.DataFrame:
    r"""Tabulate what a typical house's poll is worth at each age, and its expected error on polling day.

    A poll of age a was taken a days before the run date. ``worth_today`` counts respondents interviewed on
    the run date, ``worth_polling_day`` respondents interviewed on polling day. What a day of age costs is
    counted in opinion time: more where opinion races or jumped. The expected error is that
    of the same poll's own figure against the result (the drift is that of its age *and* of the days left),
    as a root mean square over draws, in four parts whose squares add up:

    - sampling :math:`p(1-p)(\kappa + (n-1)\rho)/n`, weighting loss and the house's floor included,
    - house, the spread of leans between houses,
    - shared lean, what all polls get wrong together,
    - drift, the move of opinion from fieldwork to polling day.

    A typical house has the mean κ and ρ of all houses in each draw, each house counted once.

    Parameters
    ----------
    draws
        Needs ``national_support`` (chain, draw, date, party), ``kappa`` and ``rho`` (chain, draw, house),
        ``drift_sd_log`` and ``house_sd_log`` (chain, draw, party), ``shared_lean_sd_log`` (party),
        ``opinion_clock`` (chain, draw, day) and the attributes ``run_date`` and ``polling_day``.
        ``drift_sd_log`` is per root of a week of opinion time.
    sample
        Respondents of the poll.
    ages
        Ages in days.
    alliances
        Alliances to report beside the parties.

    Returns
    -------
    pd.DataFrame
        One row per age and code. ``age_days``, ``code``, ``level``; ``worth_today``, ``worth_polling_day``
        in respondents (median over draws), each with ``_q05`` and ``_q95``; ``expected_error``,
        ``error_sampling``, ``error_house``, ``error_shared_lean``, ``error_drift`` in points.
    """
    share = _support_today(draws)
    kappa, rho = draws["kappa"].mean(HOUSE), draws["rho"].mean(HOUSE)
    age = xr.DataArray(list(ages), dims=_AGE)
    taken = [_run_date(draws) - pd.Timedelta(days=days) for days in ages]
    weeks = weeks_between(draws, earlier=taken, later=_run_date(draws), dim=_AGE)
    weeks_to_vote = weeks_between(draws, earlier=taken, later=_polling_day(draws), dim=_AGE)
    tables = []
    for code in codes_of(draws, alliances=alliances):
        support = share.sel({PARTY: list(code.members)}).sum(PARTY)
        drift = share_variance(share, sd_log=draws["drift_sd_log"], members=code.members)
        house = share_variance(share, sd_log=draws["house_sd_log"], members=code.members)
        shared = share_variance(share, sd_log=draws["shared_lean_sd_log"], members=code.members)
        sampling = support * (1 - support) * (kappa + (sample - 1) * rho) / sample
        today = fresh_worth(sample, weeks=weeks, share=support, drift_variance=drift, kappa=kappa)
        later = fresh_worth(sample, weeks=weeks_to_vote, share=support, drift_variance=drift, kappa=kappa)
        columns = {
            _AGE: age.to_numpy(),
            "code": code.code,
            "level": code.level,
            **_median_and_interval(today, name="worth_today"),
            **_median_and_interval(later, name="worth_polling_day"),
            **_expected_error(
                sampling=sampling, house=house, shared_lean=shared, drift=drift * weeks_to_vote
            ),
        }
        tables.append(pd.DataFrame(columns))
    return pd.concat(tables, ignore_index=True).sort_values(_AGE, kind="stable", ignore_index=True)


def summarise_half_life(
    draws: xr.Dataset, *, sample: int = 1000, alliances: Iterable[Alliance] = ()
) -> pd.DataFrame:
    """Age at which a poll of a typical house is worth half its respondents.

    Parameters
    ----------
    draws, sample, alliances
        As for `summarise_shelf_life`.

    Returns
    -------
    pd.DataFrame
        One row per code: ``code``, ``level``, ``half_life_days`` (median over draws, days back from the run
        date), ``half_life_days_q05``, ``half_life_days_q95``.
    """
    share, kappa = _support_today(draws), draws["kappa"].mean(HOUSE)
    rows = []
    for code in codes_of(draws, alliances=alliances):
        support = share.sel({PARTY: list(code.members)}).sum(PARTY)
        drift = share_variance(share, sd_log=draws["drift_sd_log"], members=code.members)
        weeks = half_life_weeks(sample, share=support, drift_variance=drift, kappa=kappa)
        days = age_in_days(draws, weeks=weeks, on=_run_date(draws))
        summary = _median_and_interval(days, name="half_life_days")
        rows.append({"code": code.code, "level": code.level, **summary})
    return pd.DataFrame(rows)


def polls_worth(
    draws: xr.Dataset, polls: pd.DataFrame, *, code: str, alliances: Iterable[Alliance] = ()
) -> pd.DataFrame:
    """State what each poll is worth on the run date, in fresh respondents of its house.

    The poll is the unit: rows that share ``poll`` are one poll and its regional breakdown, and its age
    counts from the middle of its fieldwork. National drift ages regional polls as well. Where every row
    gives an effective sample size, that takes the place of the house's κ.

    Parameters
    ----------
    draws
        As for `summarise_shelf_life`.
    polls
        Rows of the register: ``poll``, ``house``, ``start``, ``end`` (datetime64), ``respondents``,
        ``poll_respondents``, ``effective`` (NaN where not given).
    code
        Party or alliance the worth is stated for: the release's headline code.
    alliances
        Alliances ``code`` may name.

    Returns
    -------
    pd.DataFrame
        One row per poll in order of first appearance: ``poll``, ``age_days``, ``respondents``,
        ``worth_today`` (median over draws), ``worth_today_q05``, ``worth_today_q95``.

    Raises
    ------
    ValueError
        Where ``code`` names no party and no alliance.
    """
    named = {c.code: c.members for c in codes_of(draws, alliances=alliances)}
    if code not in named:
        raise ValueError(f"{code} is neither a party nor an alliance; known: {', '.join(named)}.")
    share = _support_today(draws)
    support = share.sel({PARTY: list(named[code])}).sum(PARTY)
    drift = share_variance(share, sd_log=draws["drift_sd_log"], members=named[code])
    run_date = _run_date(draws)
    asked_by_poll = dict(list(polls.groupby("poll", sort=False)))
    middles = [_middle_of_fieldwork(asked) for asked in asked_by_poll.values()]
    weeks = weeks_between(draws, earlier=middles, later=run_date, dim=POLL)
    rows = []
    for place, (poll, asked) in enumerate(asked_by_poll.items()):
        age = max((run_date - middles[place]) / pd.Timedelta(days=1), 0.0)
        respondents = float(asked["poll_respondents"].iloc[0])
        worth = fresh_worth(
            respondents,
            weeks=weeks.isel({POLL: place}),
            share=support,
            drift_variance=drift,
            kappa=_kappa_of_poll(draws, asked),
        )
        summary = _median_and_interval(worth, name="worth_today")
        rows.append({"poll": poll, "age_days": age, "respondents": respondents, **summary})
    columns = ["poll", "age_days", "respondents", "worth_today", "worth_today_q05", "worth_today_q95"]
    return pd.DataFrame(rows, columns=columns)


def _middle_of_fieldwork(asked: pd.DataFrame) -> pd.Timestamp:
    start, end = asked["start"].min(), asked["end"].max()
    return start + (end - start) / 2


def _kappa_of_poll(draws: xr.Dataset, asked: pd.DataFrame) -> xr.DataArray:
    """Loss to weighting of one poll: its own where it states an effective size, else its house's."""
    kappa = draws["kappa"].sel({HOUSE: asked["house"].iloc[0]})
    if asked["effective"].notna().all():
        own = asked["respondents"].sum() / asked["effective"].sum()
        return xr.full_like(kappa, own)
    return kappa


def _support_today(draws: xr.Dataset) -> xr.DataArray:
    """National support on the run date, the last date of the draws: dims (chain, draw, party)."""
    return draws["national_support"].isel({DATE: -1}, drop=True)


def _run_date(draws: xr.Dataset) -> pd.Timestamp:
    return pd.Timestamp(draws.attrs["run_date"])


def _polling_day(draws: xr.Dataset) -> pd.Timestamp:
    """Polling day, or the day of the run once people have voted."""
    return max(pd.Timestamp(draws.attrs["polling_day"]), _run_date(draws))


def _median_and_interval(values: xr.DataArray, *, name: str) -> dict[str, FloatArray]:
    """Median and interval over draws: one number, or one per age."""
    over_draws = values.quantile([LOWER, 0.5, UPPER], _DRAWS).to_numpy()
    return {name: over_draws[1], f"{name}_q05": over_draws[0], f"{name}_q95": over_draws[2]}


def _expected_error(**variance: xr.DataArray) -> dict[str, FloatArray]:
    """Root mean square over draws of each cause and of all together, in points."""
    mean = {cause: value.mean(_DRAWS).to_numpy() for cause, value in variance.items()}
    total = {"expected_error": POINTS * np.sqrt(sum(mean.values()))}
    return total | {f"error_{cause}": POINTS * np.sqrt(value) for cause, value in mean.items()}
