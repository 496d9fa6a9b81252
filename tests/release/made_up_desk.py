"""A made-up run for the release tests: checked inputs, seats, worth of polls, a judgement."""

from __future__ import annotations

from dataclasses import replace
from datetime import timedelta
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr

from aggregator.alternatives import Alternative
from aggregator.inputs.contest import Contest, CountingRule
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.problems import Problem, Severity
from aggregator.release.check_schemas import PRIOR_SENSITIVITY
from aggregator.release.model_checks import ModelChecks
from aggregator.screens.questions import Question, Screen, questions_table
from aggregator.seats.seats_votes import plan_shifts
from aggregator.verdict import Verdict
from tests.made_up_draws import RUN_DATE, made_up_contest, made_up_draws, made_up_last_result


def made_up_polls(contest: Contest, draws: xr.Dataset, *, seed: int = 3, polls: int = 30) -> pd.DataFrame:
    """National polls around the draws' own support, each with the columns of ``DeskInputs.polls``."""
    rng = np.random.default_rng(seed)
    codes = contest.party_codes
    dates = pd.DatetimeIndex(draws["date"].values)
    support = draws["national_support"].mean(("chain", "draw"))
    houses = [str(house) for house in draws["house"].values]
    rows = []
    for number in range(polls):
        place = number * len(dates) // polls
        end = dates[place]
        size = int(rng.integers(600, 1600))
        counts = rng.multinomial(
            size, support.isel(date=place).values / support.isel(date=place).values.sum()
        )
        rows.append(
            {
                "row": number + 2,
                "poll": f"P{number + 1:03d}",
                "house": houses[int(rng.integers(len(houses)))],
                "sponsor": "",
                "start": end - timedelta(days=int(rng.integers(1, 5))),
                "end": end,
                "published": end + timedelta(days=1) if place < len(dates) - 1 else end,
                "regions": contest.region_codes,
                "sample": size,
                "respondents": size,
                "poll_respondents": size,
                "effective": np.nan,
                "mode": "telephone",
                "population": "voters",
                "method": "",
                "undecided": np.nan,
                "source": "",
                "note": "",
                **dict(zip(codes, np.round(100 * counts / size, 1), strict=True)),
                **{alliance.code: np.nan for alliance in contest.alliances},
                "remainder": 0.0,
            }
        )
    return pd.DataFrame(rows)


def made_up_inputs(
    folder: Path, *, draws: xr.Dataset, contest: Contest | None = None, polls: int = 30
) -> DeskInputs:
    """Checked inputs of a contest folder with two small files in it."""
    contest = contest or made_up_contest()
    folder.mkdir(parents=True, exist_ok=True)
    files = (folder / "contest.toml", folder / "polls.csv")
    files[0].write_text(f'title = "{contest.title}"\n', encoding="utf-8")
    files[1].write_text("poll,house,end,sample,FER,LAN\n", encoding="utf-8")
    unused = pd.DataFrame(
        [
            {
                "poll": "X1",
                "row": 90,
                "house": "Weathercock",
                "start": "2033-02-01",
                "end": "2033-02-03",
                "why_not": "exit poll",
            }
        ]
    )
    warning = Problem(
        "polls.csv",
        4,
        "sample",
        "40000",
        "a sample below 20,000",
        "Check the figure.",
        "P17",
        Severity.WARNING,
    )
    return DeskInputs(
        folder=folder,
        contest=contest,
        run_date=RUN_DATE,
        polls=made_up_polls(contest, draws, polls=polls),
        unused_polls=unused,
        last_result=made_up_last_result(),
        warnings=(warning,),
        unpublished=(),
        files=files,
    )


def made_up_seats(draws: xr.Dataset, *, seats_per_region: int = 8, seed: int = 2) -> xr.Dataset:
    """Seats won by the largest noisy share; no code of the project counts them."""
    rng = np.random.default_rng(seed)
    regions = [str(region) for region in draws["region"].values]
    names = [f"{region.title()} {number}" for region in regions for number in range(1, seats_per_region + 1)]
    codes = [f"{region[:2]}{number:02d}" for region in regions for number in range(1, seats_per_region + 1)]
    where = np.repeat(np.arange(len(regions)), seats_per_region)
    parties = draws["party"].values
    local = rng.normal(0, 0.4, (len(codes), len(parties)))

    def shares_of(support: np.ndarray) -> np.ndarray:
        shares = support[..., where, :] * np.exp(local)
        return shares / shares.sum(axis=-1, keepdims=True)

    def winners(shares: np.ndarray) -> np.ndarray:
        return shares.argmax(axis=-1)[..., None] == np.arange(len(parties))

    dated = draws["support"].transpose("chain", "draw", "date", "region", "party").values
    over_time = winners(shares_of(dated))
    votes = shares_of(draws["support_polling_day"].transpose("chain", "draw", "region", "party").values)
    final = winners(votes)
    share = draws["support_polling_day"].mean(("chain", "draw")).values[where] * np.exp(local)
    share /= share.sum(axis=-1, keepdims=True)
    return xr.Dataset(
        {
            "seats": (("chain", "draw", "date", "party"), over_time.sum(axis=-2).astype(np.int16)),
            "seats_polling_day": (("chain", "draw", "party"), final.sum(axis=-2).astype(np.int16)),
            "won": (("chain", "draw", "seat", "party"), final.astype(np.int8)),
            "seat_votes": (("chain", "draw", "seat", "party"), votes.astype(np.float32)),
            "seat_chance": (("seat", "party"), final.mean(axis=(0, 1)).astype(np.float32)),
            "seat_expected": (("seat", "party"), final.mean(axis=(0, 1))),
            "seat_share": (("seat", "party"), share.astype(np.float32)),
            "last_share": (("seat", "party"), share.astype(np.float32)),
        },
        coords={
            "chain": draws["chain"],
            "draw": draws["draw"],
            "date": draws["date"],
            "party": draws["party"],
            "seat": codes,
            "seat_name": ("seat", names),
            "seat_region": ("seat", [regions[place] for place in where]),
            "seat_magnitude": ("seat", np.ones(len(codes), dtype=np.int64)),
        },
        attrs={"chamber": len(codes)},
    )


def made_up_shifted(draws: xr.Dataset, *, seats: int = 24) -> xr.Dataset:
    """Polling day under shifted votes, seats by the cube of the votes; no code of the project counts them."""
    contest = made_up_contest()
    votes = draws["national_support_polling_day"]
    plan = plan_shifts(
        votes,
        codes={"FER": ("FER",), "LAN": ("LAN",), "GLOW": contest.alliances[0].members},
        pairs=[("FER", "LAN"), ("GLOW", "FER")],
    )
    flat = votes.transpose("chain", "draw", "party").values.reshape(-1, 1, votes.sizes["party"])
    share = flat * np.exp(plan.sel(party=votes["party"]).values)
    share /= share.sum(axis=-1, keepdims=True)
    cubed = share**3 / (share**3).sum(axis=-1, keepdims=True)
    dims = ("draw", "shift", "party")
    return xr.Dataset(
        {"seats": (dims, np.round(seats * cubed)), "votes": (dims, share)},
        coords={"party": votes["party"]} | {name: plan[name] for name in ("code", "against", "log_factor")},
    )


def with_overhang(seats: xr.Dataset, *, code: str = "HED", most: int = 3, seed: int = 5) -> xr.Dataset:
    """The same seats in a mixed chamber that grows: up to some seats more for one party, from lists."""
    rng = np.random.default_rng(seed)
    extra = rng.integers(0, most + 1, (seats.sizes["chain"], seats.sizes["draw"]))
    more = xr.DataArray(extra, dims=("chain", "draw")) * (seats["party"] == code)
    return seats.assign(
        seats=(seats["seats"] + more).astype(np.int16),
        seats_polling_day=(seats["seats_polling_day"] + more).astype(np.int16),
        list_seats_polling_day=more.astype(np.int16),
    )


def made_up_shelf_life(contest: Contest) -> pd.DataFrame:
    """Worth by age from a made-up half-life of 24 days."""
    rows = []
    for code in (*contest.party_codes, *(alliance.code for alliance in contest.alliances)):
        level = (
            "others"
            if code == "OTH"
            else "alliance"
            if code in {a.code for a in contest.alliances}
            else "party"
        )
        for age in range(0, 91):
            today, later = 1000 / (1 + age / 24), 1000 / (1 + (age + 70) / 24)
            rows.append(
                {
                    "age_days": age,
                    "code": code,
                    "level": level,
                    "worth_today": today,
                    "worth_today_q05": 1000 / (1 + age / 15),
                    "worth_today_q95": 1000 / (1 + age / 36),
                    "worth_polling_day": later,
                    "worth_polling_day_q05": 1000 / (1 + (age + 70) / 15),
                    "worth_polling_day_q95": 1000 / (1 + (age + 70) / 36),
                    "expected_error": 3.5,
                    "error_sampling": 1.8,
                    "error_house": 1.2,
                    "error_shared_lean": 2.3,
                    "error_drift": 1.4,
                }
            )
    return pd.DataFrame(rows)


def made_up_polls_worth(inputs: DeskInputs) -> pd.DataFrame:
    """Worth today of each poll, by the same half-life."""
    polls = inputs.polls.drop_duplicates("poll")
    age = (pd.Timestamp(inputs.run_date) - polls["end"]).dt.days
    return pd.DataFrame(
        {"poll": polls["poll"], "worth_today": polls["poll_respondents"] / (1 + age / 24), "pareto_k": 0.2}
    )


def made_up_screens(inputs: DeskInputs) -> pd.DataFrame:
    """One question about the first poll."""
    first = inputs.polls.iloc[0]
    question = Question(
        screen=Screen.SAMPLE_SIZE,
        house=first["house"],
        code="",
        polls=first["poll"],
        found="5000 respondents",
        usual="1000 respondents",
        question="Was a digit added on the way into the register?",
    )
    return questions_table([question])


def made_up_checks(draws: xr.Dataset, seats: xr.Dataset) -> ModelChecks:
    """Other assumptions that widen or narrow polling day, one that needs a fit; figures; weight of priors."""
    names = ["national_support_polling_day", "support_polling_day", "turnout_weight"]
    used = draws[names]
    middle = used.mean(("chain", "draw"))
    narrow = middle + 0.5 * (used - middle)
    size = "size of the shared lean"
    alternatives = (
        Alternative("correlation of the shared lean between elections", "0", False, None, None, 0.9),
        Alternative("correlation of the shared lean between elections", "1/3", True, used, seats, 0.0),
        Alternative(size, "in use", True, used, seats, 0.0),
        Alternative(size, "none", False, narrow, seats, 0.2),
    )
    figures = [
        ("", "", 120, 48.3, 88.3, 0.02, 1.04, ""),
        ("Plumb Line", "", 60, 51.0, 91.0, 0.01, 0.98, "no"),
        ("Weathercock", "", 60, 20.0, 55.0, 0.05, 2.6, "yes"),
        ("Plumb Line", "FER", 12, 50.0, 91.7, 0.1, 0.9, ""),
    ]
    columns = ["house", "code", "figures", "inside_50", "inside_90", "mean_z", "spread_z", "stands_out"]
    grounds = [
        ("support_on_date", "FER", float("nan"), 0.07, float("nan"), 88.0, 0.0, 12.0, "Words on the date."),
        ("support_on_polling_day", "FER", 0.03, 0.08, 0.06, 61.0, 30.0, 9.0, "Words on polling day."),
    ]
    return ModelChecks(
        alternatives=alternatives,
        predictive=pd.DataFrame(figures, columns=columns),
        prior_sensitivity=pd.DataFrame(grounds, columns=list(PRIOR_SENSITIVITY.column_names)),
    )


def made_up_verdict(*, passed: bool = True) -> Verdict:
    """A judgement with one check."""
    table = pd.DataFrame(
        [
            {
                "check": "largest R-hat",
                "value": 1.004 if passed else 1.08,
                "limit": 1.01,
                "passed": passed,
                "meaning": "the chains do not agree on where the answer lies",
            }
        ]
    )
    text = "All checks of the fit passed." if passed else "The chains did not agree."
    return Verdict(passed=passed, table=table, text=text)


def contest_without_seats() -> Contest:
    """The made-up contest, where nothing is counted in seats."""
    contest = made_up_contest()
    return contest.model_copy(
        update={"counting": contest.counting.model_copy(update={"rule": CountingRule.NONE})}
    )


def made_up_run(
    folder: Path, *, passed: bool = True, unpublished: tuple[str, ...] = (), **sizes: int
) -> dict[str, object]:
    """Arguments of ``write_release`` for a small run, by name (``inputs`` too)."""
    draws = made_up_draws(
        **{"chains": 2, "draws": 60, "dates": 5} | {k: v for k, v in sizes.items() if k != "polls"}
    )
    inputs = replace(
        made_up_inputs(folder, draws=draws, polls=sizes.get("polls", 30)), unpublished=unpublished
    )
    seats = made_up_seats(draws)
    return {
        "inputs": inputs,
        "draws": draws,
        "seats": seats,
        "shifted": made_up_shifted(draws),
        "checks": made_up_checks(draws, seats),
        "shelf_life": made_up_shelf_life(inputs.contest),
        "polls_worth": made_up_polls_worth(inputs),
        "screens": made_up_screens(inputs),
        "verdict": made_up_verdict(passed=passed),
        "settings": {"seed": 1, "chains": 2, "draws": 60},
    }
