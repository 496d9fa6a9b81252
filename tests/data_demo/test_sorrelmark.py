"""The second demo folder: made again byte for byte, read without surprises, counted alike by two programs."""

from datetime import date
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

import data_demo
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.counting_terms import CountingRule
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.inputs.reading_rules import Rule
from aggregator.seats.counting import count_seats
from data_demo.made_up_seat_count import count_chamber
from data_demo.make_sorrelmark import write_sorrelmark
from data_demo.sorrelmark_scenery import COUNTING, SORRELMARK

FOLDER = Path(data_demo.__file__).parent / "sorrelmark"
CODES = list(SORRELMARK.codes)
REGULAR_SEATS = 116


@pytest.fixture(scope="module")
def inputs() -> DeskInputs:
    return read_contest_folder(FOLDER, today=date(2025, 10, 3))


@pytest.fixture(scope="module")
def outcome() -> pd.DataFrame:
    votes = pd.read_csv(FOLDER / "result_outcome.csv")
    votes[CODES] = votes[CODES].fillna(0)
    return votes


@pytest.fixture(scope="module")
def transfers() -> pd.DataFrame:
    return pd.read_csv(FOLDER / "truth" / "run_off_transfers.csv")


def test_the_script_makes_every_file_again_byte_for_byte(tmp_path: Path) -> None:
    write_sorrelmark(tmp_path)
    made = {p.relative_to(tmp_path): p.read_bytes() for p in tmp_path.rglob("*") if p.is_file()}
    for name, content in made.items():
        assert (FOLDER / name).read_bytes() == content, f"{name} differs: run the script again"
    kept = {p.relative_to(FOLDER) for p in (FOLDER / "truth").iterdir()}
    kept |= {p.relative_to(FOLDER) for p in FOLDER.iterdir() if p.is_file()}
    assert kept == set(made)


def test_the_reader_takes_the_folder_and_doubts_only_the_seat_made_since(inputs: DeskInputs) -> None:
    assert [w.rule for w in inputs.warnings] == [Rule.EARLIER_PLACES]
    assert "HOPS-13" in inputs.warnings[0].found
    assert inputs.before_last is not None
    assert inputs.transfers is not None
    assert len(inputs.transfers) == len(CODES) * (len(CODES) - 1)


def test_regions_count_by_three_rules_and_all_parts_add_up_to_the_chamber(inputs: DeskInputs) -> None:
    contest = inputs.contest
    rules = {terms.rule: regions for terms, regions in contest.counting_groups}
    assert rules == {
        CountingRule.MIXED_COMPENSATORY: ("WEIR", "HOPS", "SALT", "MOOR"),
        CountingRule.HIGHEST_AVERAGES: ("CITY",),
        CountingRule.TWO_ROUND: ("HOLM",),
    }
    assert inputs.last_result is not None
    by_region = inputs.last_result.groupby("region")["seats"].sum()
    assert by_region.to_dict() == {"CITY": 22, "WEIR": 14, "HOPS": 13, "SALT": 11, "MOOR": 10, "HOLM": 6}
    assert by_region.sum() + COUNTING.list_seats == contest.counting.seats == REGULAR_SEATS


def test_the_register_shows_what_a_desk_meets() -> None:
    polls = pd.read_csv(FOLDER / "polls.csv", keep_default_na=False)
    assert 60 <= polls["poll"].nunique() <= 100
    assert polls["house"].nunique() == 6
    whole = polls.drop_duplicates("poll")
    assert set(whole.loc[whole["region"] != "", "house"]) == {"Harrovane Research", "Tibberlow"}
    assert set(polls.loc[polls["poll"].duplicated(keep=False), "house"]) == {"Quillern"}
    away = ~polls["region"].isin(["", "WEIR", "MOOR"])
    assert (polls.loc[away, "MV"] == "").all()


def test_the_truth_tells_every_seat_once_and_the_chamber_grew() -> None:
    seats = pd.read_csv(FOLDER / "truth" / "seats_won.csv").set_index("code")["seats"]
    places = pd.read_csv(FOLDER / "truth" / "seats_won_by_place.csv")
    numbers = pd.read_csv(FOLDER / "truth" / "country_numbers.csv").set_index("quantity")["value"]
    assert seats.sum() == numbers["seats of the chamber that was elected"] > REGULAR_SEATS
    assert numbers["seats of the chamber"] == REGULAR_SEATS
    by_code = places.groupby("code")["seats"].sum()
    assert by_code.reindex(seats.index, fill_value=0).tolist() == seats.tolist()
    by_way = places.groupby("how")["seats"].sum()
    assert by_way["most_votes"] == 48 and by_way["district"] == 22
    assert by_way.get("run_off", 0) + by_way.get("first_round", 0) == 6


def test_an_exempt_party_has_list_seats_below_the_threshold_and_another_just_passes_it(
    outcome: pd.DataFrame,
) -> None:
    mixed = outcome[outcome["region"].isin(["WEIR", "HOPS", "SALT", "MOOR"])][CODES].sum()
    shares = 100 * mixed / mixed.sum()
    places = pd.read_csv(FOLDER / "truth" / "seats_won_by_place.csv")
    from_lists = set(places.loc[places["how"] == "lists", "code"])
    assert shares["MV"] < COUNTING.threshold < shares["PL"] < COUNTING.threshold + 1
    assert {"MV", "PL"} <= from_lists


def test_the_race_is_close_and_a_run_off_is_won_by_the_second() -> None:
    seats = pd.read_csv(FOLDER / "truth" / "seats_won.csv").set_index("code")["seats"]
    line = seats.sum() // 2 + 1
    assert seats.max() < line - 10
    assert line - 6 <= seats[["CB", "EK"]].sum() <= line + 6
    run_offs = pd.read_csv(FOLDER / "truth" / "run_offs.csv").set_index(["seat", "code"])
    leaders = run_offs.groupby("seat").idxmax()
    assert (leaders["first_round"] != leaders["run_off"]).sum() == 1


def test_seats_stray_between_the_last_two_results_by_the_noise_of_the_truth(inputs: DeskInputs) -> None:
    """Log share against the region's mean, the slope on the old one taken out, of four large parties."""
    before, last = inputs.before_last, inputs.last_result
    assert before is not None and last is not None
    local_sd = pd.read_csv(FOLDER / "truth" / "party_scales.csv").set_index("code")["local_sd"]
    shares = []
    for votes in (before, last):
        rows = votes.set_index("seat").loc[lambda t: t.index != "HOPS-13"]
        party = rows[["CB", "GH", "LT", "TF"]].div(rows[[c for c in CODES if c in rows]].sum(axis=1), axis=0)
        log_share = np.log(party)
        shares.append(log_share - log_share.groupby(rows["region"]).transform("mean"))
    old, new = shares
    for code in ("CB", "GH", "LT", "TF"):
        slope = (old[code] @ (new - old)[code]) / (old[code] @ old[code])
        left = (new - old)[code] - slope * old[code]
        # Shares sum to one, and regions and slope take their part: about a tenth each way, and sampling.
        found = np.sqrt((left**2).sum() / (len(left) - 6 - 1))
        assert found == pytest.approx(local_sd[code], rel=0.45)


def test_the_tool_counts_the_outcome_as_the_simulator_does(
    inputs: DeskInputs, outcome: pd.DataFrame, transfers: pd.DataFrame
) -> None:
    seats = pd.read_csv(FOLDER / "truth" / "seats_won.csv").set_index("code")["seats"]
    counted = _counted_by_the_tool(outcome, inputs=inputs, transfers=transfers)
    assert counted["seats_polling_day"].squeeze().to_series().loc[CODES].tolist() == seats.loc[CODES].tolist()
    places = pd.read_csv(FOLDER / "truth" / "seats_won_by_place.csv")
    from_lists = places[places["how"] == "lists"].set_index("code")["seats"].reindex(CODES, fill_value=0)
    assert counted["list_seats_polling_day"].squeeze().to_series().loc[CODES].tolist() == from_lists.tolist()
    won = counted["won"].squeeze().to_series()
    local = places[places["how"] != "lists"].set_index(["place", "code"])["seats"]
    assert won[won > 0].sort_index().to_dict() == local.sort_index().to_dict()


def test_the_tool_counts_any_other_outcome_as_the_simulator_does(
    inputs: DeskInputs, outcome: pd.DataFrame, transfers: pd.DataFrame
) -> None:
    """Votes far from these: other leaders, lists about the threshold, larger and smaller chambers."""
    rng = np.random.default_rng(7)
    chambers = set()
    for _ in range(15):
        votes = outcome.copy()
        country, local = 0.35 * rng.normal(size=len(CODES)), 0.25 * rng.normal(size=(len(votes), len(CODES)))
        votes[CODES] = np.rint(votes[CODES] * np.exp(country + local))
        count = count_chamber(votes, scenery=SORRELMARK, transfers=transfers)
        counted = _counted_by_the_tool(votes, inputs=inputs, transfers=transfers)
        assert counted["seats_polling_day"].squeeze().to_series().loc[CODES].tolist() == count.seats.tolist()
        chambers.add(count.seats.sum())
    assert len(chambers) >= 3


def _counted_by_the_tool(votes: pd.DataFrame, *, inputs: DeskInputs, transfers: pd.DataFrame) -> xr.Dataset:
    """One draw in which every region votes as counted, and the voters of run-offs as they did."""
    regions = list(SORRELMARK.region_codes)
    by_region = votes.groupby("region")[CODES].sum().loc[regions]
    share = by_region.div(by_region.sum(axis=1), axis=0).to_numpy()[None, None]
    day = np.datetime64(inputs.contest.polling_day, "ns")
    draws = xr.Dataset(
        {
            "support": (("chain", "draw", "date", "region", "party"), share[:, :, None]),
            "support_polling_day": (("chain", "draw", "region", "party"), share),
            "turnout_weight": (
                ("chain", "draw", "region"),
                (by_region.sum(axis=1) / by_region.to_numpy().sum()).to_numpy()[None, None],
            ),
        },
        coords={"chain": [0], "draw": [0], "date": [day], "region": regions, "party": CODES},
    )
    assert inputs.last_result is not None
    return count_seats(
        draws,
        last_result=inputs.last_result,
        contest=inputs.contest,
        rng=np.random.default_rng(0),
        counted_result=votes,
        transfers=transfers.assign(sd=0.0),
    )
