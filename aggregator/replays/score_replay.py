"""A replay's fits against the result: every score, beside the rivals'."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from datetime import date

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.inputs.contest import Contest
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.replays.calibration import summarise_places, summarise_reliability
from aggregator.replays.compare_methods import compare_methods
from aggregator.replays.distribution_scores import (
    INTERVALS,
    central_intervals,
    place_of_truth,
    score_crps,
    score_log,
)
from aggregator.replays.methods import Method, Quantity
from aggregator.replays.replayed_fit import ReplayedFit, as_of, in_order_of_dates
from aggregator.replays.result_shares import (
    COUNTRY,
    ScoredCodes,
    has_seats,
    result_shares,
    scored_codes,
    seats_of_outcome,
)
from aggregator.replays.rivals import Rivals
from aggregator.replays.seat_scores import LISTED, list_seat_chances, score_seats
from aggregator.replays.staleness import measure_staleness, single_poll_errors
from aggregator.replays.summarise_scores import summarise_scores
from aggregator.settings import DEFAULT_SEED
from models.dimensions import DRAW, PARTY, REGION

PERCENT = 100.0
_HALF_A_SEAT = 0.5
_DISTRIBUTION = [
    "log_score",
    *(f"width_{percent}" for percent in INTERVALS),
    *(f"inside_{percent}" for percent in INTERVALS),
    "pit",
    "low_90",
    "high_90",
]


@dataclass(frozen=True)
class ReplayScores:
    """Everything measured in the replay of one contest, unrounded.

    Attributes
    ----------
    title, polling_day
        The contest.
    scores, seat_scores, reliability, places, summary, comparisons, staleness
        Tables as ``docs/formats.md`` describes them; ``seat_scores`` and ``reliability`` without rows where
        nothing is counted in seats.
    seat_chances
        Every chance behind ``reliability``: ``contest, as_of, days_before, seat, code, chance, won``.
    poll_errors
        Every error behind ``staleness``: ``contest, poll, code, level, days_before, sample, error``.
    expected_errors
        What the formula said: ``contest, as_of, days_before, code, expected_error``, the days being those
        from the poll to polling day.
    """

    title: str
    polling_day: date
    scores: pd.DataFrame
    seat_scores: pd.DataFrame
    reliability: pd.DataFrame
    places: pd.DataFrame
    summary: pd.DataFrame
    comparisons: pd.DataFrame
    staleness: pd.DataFrame
    seat_chances: pd.DataFrame
    poll_errors: pd.DataFrame
    expected_errors: pd.DataFrame


def score_replay(
    records: Iterable[ReplayedFit],
    *,
    inputs: DeskInputs,
    outcome: pd.DataFrame,
    seed: int = DEFAULT_SEED,
    polls_as_of: Mapping[date, pd.DataFrame] | None = None,
) -> ReplayScores:
    """Score the fits of past dates, and what rivals would have said, against the result.

    Parameters
    ----------
    records
        Fits of one contest, in any order; scores go by date.
    inputs
        The contest as it stands now: its polls, and the last result.
    outcome
        Votes of the election, in the form of the last result.
    seed
        Of the random part of the place of whole numbers.
    polls_as_of
        The polls as they stood on each date, so that rivals see a figure that was corrected later as it was
        first printed. For a date that is missing here they see the rows of ``inputs`` published by then.

    Returns
    -------
    ReplayScores
        Unrounded tables.

    Raises
    ------
    InputError
        If the outcome does not say who won a seat.
    ValueError
        If there are no records.
    """
    fits = in_order_of_dates(records)
    if not fits:
        raise ValueError("a replay needs at least one fit")
    contest = inputs.contest
    codes = scored_codes(contest, on=contest.last_polling_day)
    truth = _truth(outcome, contest=contest, codes=codes)
    rng = np.random.default_rng(seed)
    rivals = _rivals_by_day([as_of(fit) for fit in fits], inputs=inputs, polls_as_of=polls_as_of or {})
    rows = []
    for fit in fits:
        rows += list(_rows_of_fit(fit, truth=truth, codes=codes, rng=rng))
        rows += list(_rows_of_rivals(rivals[as_of(fit)], as_of(fit), truth=truth, codes=codes))
    scores = _in_form(pd.concat(rows, ignore_index=True), contest=contest, codes=codes)
    chances = pd.DataFrame(columns=LISTED)
    seat_table = score_seats(chances)
    if truth.won is not None:
        chances = list_seat_chances(
            fits,
            swing={day: asked.seats(day) for day, asked in rivals.items()},
            won=truth.won,
            contest=contest,
        )
        seat_table = score_seats(chances)
    poll_errors = single_poll_errors(inputs, truth=truth.shares(COUNTRY), codes=codes)
    expected = _expected_errors(fits, contest=contest)
    ours = chances[chances["method"] == Method.FIELDFOLD]
    return ReplayScores(
        title=contest.title,
        polling_day=contest.last_polling_day,
        scores=scores,
        seat_scores=seat_table,
        reliability=summarise_reliability(ours),
        places=summarise_places(scores),
        summary=summarise_scores(scores),
        comparisons=compare_methods(scores),
        staleness=measure_staleness(scores, poll_errors=poll_errors, expected_errors=expected),
        seat_chances=ours,
        poll_errors=poll_errors,
        expected_errors=expected,
    )


@dataclass(frozen=True)
class _Truth:
    """Shares 0–1 (region, code), seats (code) and winners (seat, party); None where nothing is counted."""

    support: pd.DataFrame
    seats: pd.Series | None
    won: pd.DataFrame | None

    def shares(self, region: str) -> pd.Series:
        """Shares of every code in a region."""
        return self.support.T[region]


def _truth(outcome: pd.DataFrame, *, contest: Contest, codes: ScoredCodes) -> _Truth:
    support = result_shares(outcome, contest=contest) @ codes.sums.T
    if not has_seats(outcome, contest=contest):
        return _Truth(support, None, None)
    seats = seats_of_outcome(outcome, contest=contest)
    return _Truth(support, codes.sums @ seats.total, seats.won)


def _rivals_by_day(
    days: Iterable[pd.Timestamp], *, inputs: DeskInputs, polls_as_of: Mapping[date, pd.DataFrame]
) -> dict[pd.Timestamp, Rivals]:
    def of(polls: pd.DataFrame) -> Rivals:
        return Rivals(
            polls,
            contest=inputs.contest,
            last_result=inputs.last_result,
            counted_result=inputs.counted_result,
        )

    as_they_stand = of(inputs.polls)
    return {day: of(polls_as_of[day.date()]) if day.date() in polls_as_of else as_they_stand for day in days}


def _rows_of_fit(
    fit: ReplayedFit, *, truth: _Truth, codes: ScoredCodes, rng: np.random.Generator
) -> Iterator[pd.DataFrame]:
    country = fit.data["national_support_polling_day"]
    yield _score_draws(country, truth.shares(COUNTRY), codes, fit, region=COUNTRY, rng=rng)
    regional = fit.data["support_polling_day"]
    if regional.sizes[REGION] > 1:
        for region in (str(r) for r in regional[REGION].values):
            here = regional.sel({REGION: region}, drop=True)
            yield _score_draws(here, truth.shares(region), codes, fit, region=region, rng=rng)
    if truth.seats is not None and "seats_polling_day" in fit.data:
        yield _score_draws(
            fit.data["seats_polling_day"], truth.seats, codes, fit, region=COUNTRY, rng=rng, seats=True
        )


def _score_draws(
    draws: xr.DataArray,
    truth: pd.Series,
    codes: ScoredCodes,
    fit: ReplayedFit,
    *,
    region: str,
    rng: np.random.Generator,
    seats: bool = False,
) -> pd.DataFrame:
    """One row per code; codes that do not stand here, or are counted already, have no draws to score."""
    unit = 1.0 if seats else PERCENT
    by_party = draws.transpose(DRAW, PARTY).sel({PARTY: list(codes.parties)}).to_numpy().astype(float)
    values = unit * by_party @ codes.sums.to_numpy().T
    kept = np.ones(values.shape[1], dtype=bool) if seats else np.ptp(values, axis=0) > 1e-9
    values, names = values[:, kept], codes.sums.index[kept]
    wanted = unit * truth[names].to_numpy(float)
    table = pd.DataFrame(
        {
            "as_of": as_of(fit),
            "method": str(Method.FIELDFOLD),
            "quantity": str(Quantity.SEATS if seats else Quantity.SUPPORT),
            "region": region,
            "code": names,
            "estimate": values.mean(axis=0),
            "truth": wanted,
            "crps": score_crps(values, wanted),
            "log_score": score_log(values, wanted, least_bandwidth=_HALF_A_SEAT if seats else 0.0),
            "pit": place_of_truth(values, wanted, rng=rng),
        }
    )
    ends = central_intervals(values, whole=seats)
    for percent, (low, high) in ends.items():
        table[f"width_{percent}"] = high - low
        table[f"inside_{percent}"] = ((low <= wanted) & (wanted <= high)).astype(float)
    return table.assign(low_90=ends[90][0], high_90=ends[90][1])


def _rows_of_rivals(
    rivals: Rivals, day: pd.Timestamp, *, truth: _Truth, codes: ScoredCodes
) -> Iterator[pd.DataFrame]:
    for method, shares in rivals.support(day).items():
        said = PERCENT * shares @ codes.sums.T
        for region in said.index:
            yield _plain_rows(said.T[region], PERCENT * truth.shares(region), day, method, region=region)
    if truth.seats is not None:
        for method, seats in rivals.seats(day).items():
            yield _plain_rows(
                codes.sums @ seats.sum(), truth.seats, day, method, region=COUNTRY, quantity=Quantity.SEATS
            )


def _plain_rows(
    estimate: pd.Series,
    truth: pd.Series,
    day: pd.Timestamp,
    method: Method,
    *,
    region: str,
    quantity: Quantity = Quantity.SUPPORT,
) -> pd.DataFrame:
    table = pd.DataFrame(
        {
            "as_of": day,
            "method": str(method),
            "quantity": str(quantity),
            "region": region,
            "code": estimate.index,
            "estimate": estimate.to_numpy(float),
            "truth": truth[estimate.index].to_numpy(float),
        }
    )
    table["crps"] = (table["estimate"] - table["truth"]).abs()
    return table.reindex(columns=[*table.columns, *_DISTRIBUTION]).astype(dict.fromkeys(_DISTRIBUTION, float))


def _in_form(scores: pd.DataFrame, *, contest: Contest, codes: ScoredCodes) -> pd.DataFrame:
    vote = pd.Timestamp(contest.last_polling_day)
    scores = scores[scores["estimate"].notna() & scores["truth"].notna()]
    # Rivals are held against the same figures: not where a party does not stand, or the count is in.
    keys = ["as_of", "quantity", "region", "code"]
    scored = scores.loc[scores["method"] == Method.FIELDFOLD, keys]
    scores = scores.merge(scored, on=keys)
    scores = scores.assign(
        contest=contest.title,
        days_before=(vote - scores["as_of"]).dt.days,
        level=scores["code"].map(codes.levels),
        error=scores["estimate"] - scores["truth"],
    )
    columns = [
        "contest", "as_of", "days_before", "method", "quantity", "region", "code", "level",
        "estimate", "truth", "error", "crps", *_DISTRIBUTION,
    ]  # fmt: skip
    return scores[columns].reset_index(drop=True)


def _expected_errors(fits: Iterable[ReplayedFit], *, contest: Contest) -> pd.DataFrame:
    """Formula's error by the days from a poll to polling day, as each fit gave it."""
    vote = pd.Timestamp(contest.last_polling_day)
    tables = []
    for fit in fits:
        errors = fit.data["expected_error"].transpose("age", "code")
        codes = [str(code) for code in errors["code"].values]
        formula = pd.DataFrame(errors.to_numpy(), pd.Index(errors["age"].values, name="age"), codes)
        left = (vote - as_of(fit)).days
        long = formula.reset_index().melt("age", var_name="code", value_name="expected_error")
        tables.append(
            pd.DataFrame(
                {
                    "contest": contest.title,
                    "as_of": as_of(fit),
                    "days_before": long["age"].astype(float) + left,
                    "code": long["code"].astype(str),
                    "expected_error": long["expected_error"].astype(float),
                }
            )
        )
    return pd.concat(tables, ignore_index=True)
