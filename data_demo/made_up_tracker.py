"""A tracking poll: interviews every day, published as windows that share them."""

from __future__ import annotations

import numpy as np
import pandas as pd

from data_demo.made_up_answers import draw_answers, expected_answers, group_codes, print_cells
from data_demo.made_up_country import Country
from data_demo.made_up_leans import HouseTruth
from data_demo.made_up_scenery import MadeUpHouse

DAILY_NOISE = 0.05
"""Log sd of a day's number of interviews."""


def draw_interviews(
    country: Country, *, houses: HouseTruth, house: int, rng: np.random.Generator
) -> pd.DataFrame:
    """Draw each day's interviews: columns house, date, asked, code, answers.

    A day's answers stray by the design effect of a whole window, and days are independent: a window then
    strays as a poll of its size does, and windows without a common day have nothing in common.

    Raises
    ------
    ValueError
        Where the house tracks nobody.
    """
    scenery, asker = country.scenery, country.scenery.houses[house]
    tracker = asker.tracker
    if tracker is None:
        raise ValueError(f"{asker.name} has no tracking poll.")
    groups = group_codes(scenery, house=asker, day=tracker.first_day, rng=rng)
    together = [a.code for a in scenery.alliances if a.code in groups]
    frames = []
    for day in range(country.day_number(tracker.first_day), country.day_number(scenery.register_end)):
        era = asker.era_on(country.days[day].date())
        effect = houses.whole_effect(
            house, era=era, mode=asker.main_mode(era), population=asker.population, together=together
        )
        asked = round(tracker.sample / tracker.window_days * np.exp(DAILY_NOISE * rng.normal()))
        decided = asked - int(rng.binomial(asked, (asker.undecided or 0.0) / 100))
        deff = houses.design_effect(house, respondents=decided * tracker.window_days)
        expected = country.weights @ expected_answers(country, effect=effect, first_day=day, last_day=day)
        cells = draw_answers(expected, groups=groups, respondents=decided, deff=deff, rng=rng)
        frames.append(
            pd.DataFrame(
                {
                    "house": asker.name,
                    "date": str(country.days[day].date()),
                    "asked": asked,
                    "code": list(cells),
                    "answers": list(cells.values()),
                }
            )
        )
    return pd.concat(frames, ignore_index=True)


def window_rows(daily: pd.DataFrame, *, house: MadeUpHouse, kappa: float) -> list[dict[str, object]]:
    """Rows of the register: the interviews of each window summed and printed, the day after its last one.

    Parameters
    ----------
    daily
        What :func:`draw_interviews` gives.
    kappa
        What weighting costs the house.

    Raises
    ------
    ValueError
        Where the house tracks nobody.
    """
    tracker = house.tracker
    if tracker is None:
        raise ValueError(f"{house.name} has no tracking poll.")
    asked = daily.drop_duplicates("date").set_index("date")["asked"]
    days = list(asked.index)
    rows: list[dict[str, object]] = []
    for last in range(tracker.window_days - 1, len(days), tracker.every_days):
        window = days[last - tracker.window_days + 1 : last + 1]
        answers = daily[daily["date"].isin(window)].groupby("code", sort=False)["answers"].sum()
        sample = int(asked[window].sum())
        published = str((pd.Timestamp(window[-1]) + pd.Timedelta(days=1)).date())
        era = house.era_on(pd.Timestamp(window[0]).date())
        row: dict[str, object] = {
            "poll": f"{house.label}-T{len(rows) + 1:02d}",
            "house": house.name,
            "sponsor": tracker.sponsor,
            "start": window[0],
            "end": window[-1],
            "published": published,
            "question": "vote",
            "region": "",
            "sample": sample,
            "mode": house.main_mode(era),
            "population": house.population,
            "status": "final",
            "source": f"release {published}",
            **print_cells(
                {str(code): int(count) for code, count in answers.items()},
                house=house,
                sample=sample,
                decided=int(answers.sum()),
                kappa=kappa,
            ),
        }
        if house.methods[era]:
            row["method"] = house.methods[era]
        rows.append(row)
    return rows
