"""The demo folder: made again byte for byte, read without surprises, true to the truth beside it."""

from datetime import date
from pathlib import Path

import pandas as pd
import pytest

import data_demo
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.reading_rules import Rule
from data_demo.lake_provinces_scenery import LAKE_PROVINCES
from data_demo.make_lake_provinces import write_lake_provinces

FOLDER = Path(data_demo.__file__).parent / "lake_provinces"
CODES = list(LAKE_PROVINCES.codes)


@pytest.fixture(scope="module")
def made_again(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("demo") / "lake_provinces"
    write_lake_provinces(folder)
    return folder


def test_the_script_makes_every_file_again_byte_for_byte(made_again: Path) -> None:
    made = {p.relative_to(made_again): p.read_bytes() for p in made_again.rglob("*") if p.is_file()}
    for name, content in made.items():
        assert (FOLDER / name).read_bytes() == content, f"{name} differs: run the script again"
    kept = {p.relative_to(FOLDER) for p in (FOLDER / "truth").iterdir()}
    kept |= {p.relative_to(FOLDER) for p in FOLDER.iterdir() if p.is_file()}
    assert kept == set(made)


def test_the_reader_takes_the_demo_and_doubts_only_what_is_meant_to_be_doubtful() -> None:
    """Windows that share days, polls from after the Isles had voted, and the new party."""
    inputs = read_contest_folder(FOLDER, today=date(2026, 5, 9))
    assert {w.rule for w in inputs.warnings} == {
        Rule.WINDOWS_OVERLAP,
        Rule.HAD_VOTED,
        Rule.PARTY_WITHOUT_VOTES,
    }
    assert inputs.contest.counting.majority == 101
    reasons = " ".join(inputs.unused_polls["why_not"])
    for word in ("corrected", "withdrawn", "hypothetical", "no sample was drawn"):
        assert word in reasons


def test_the_register_shows_what_a_desk_meets() -> None:
    polls = pd.read_csv(FOLDER / "polls.csv", keep_default_na=False)
    assert 250 <= polls["poll"].nunique() <= 300
    assert polls.loc[polls["use"].ne("no"), "house"].nunique() == 9
    assert polls["published"].max() == "2026-05-09"
    whole = polls.drop_duplicates("poll")
    assert (whole["region"] != "").mean() > 0.05
    assert (polls["HILL"] != "").any() and (polls["LAKE"] != "").any()
    pooled = polls[polls["HILL"] != ""]
    assert (pooled[["UP", "TL"]] == "").all(axis=None)
    assert (pooled["start"] >= "2025-03-01").all()


def test_the_register_shows_what_makes_figures_differ() -> None:
    polls = pd.read_csv(FOLDER / "polls.csv", keep_default_na=False)
    used = polls[polls["use"].ne("no")]
    tarvick = used[used["house"] == "Tarvick Surveys"].groupby("method")["start"]
    assert tarvick.max()["calls to landlines and mobiles"] < "2025-07-01"
    assert tarvick.min()["calls and own web panel"] >= "2025-07-01"
    assert set(used["mode"]) == {"online", "telephone", "face_to_face", "mixed"}
    assert set(used["population"]) == {"voters", "adults", "registered"}
    assert used.groupby("house")["mode"].nunique()["Marrimund"] == 2
    assert set(used.loc[used["effective"] != "", "house"]) == {"Veldane Institute"}
    broken_down = used[used["poll"].duplicated(keep=False)].groupby("poll")["region"].agg(set)
    assert {"", "NORTH", "HARB", "REED"} in list(broken_down)
    windows = used[used["poll"].str.startswith("PEL-T")].sort_values("end")
    assert len(windows) == 12
    assert (windows["start"].iloc[1:].to_numpy() <= windows["end"].iloc[:-1].to_numpy()).all()


def test_the_isles_have_voted_and_been_counted_when_the_register_ends() -> None:
    inputs = read_contest_folder(FOLDER, today=date(2026, 5, 9))
    assert inputs.contest.polling_day_of("ISLE") == date(2026, 5, 3)
    assert inputs.counted_result is not None
    outcome = pd.read_csv(FOLDER / "result_outcome.csv").set_index("seat")
    counted = pd.read_csv(FOLDER / "result_counted.csv").set_index("seat")
    assert len(counted) == 13
    pd.testing.assert_frame_equal(counted, outcome.loc[counted.index])
    support = pd.read_csv(FOLDER / "truth" / "support_over_time.csv")
    isles = support[support["region"].eq("ISLE") & support["date"].ge("2026-05-03")]
    assert isles.groupby("code")["share"].nunique().max() == 1


def test_the_contest_knows_the_jolt_and_the_record() -> None:
    inputs = read_contest_folder(FOLDER, today=date(2026, 5, 9))
    assert [(j.date, j.weeks) for j in inputs.contest.jolts] == [(date(2025, 10, 6), 4.0)]
    moved = pd.read_csv(FOLDER / "truth" / "jolts.csv").set_index("code")["moved"]
    assert moved["HU"] < -0.5
    assert inputs.past_errors is not None
    assert inputs.past_errors["election"].nunique() == 5


def test_the_winners_in_the_outcome_are_the_seats_of_the_truth() -> None:
    outcome = pd.read_csv(FOLDER / "result_outcome.csv")
    won = outcome[CODES].idxmax(axis=1).value_counts()
    truth = pd.read_csv(FOLDER / "truth" / "seats_won.csv").set_index("code")["seats"]
    assert truth.sum() == 200 == len(outcome)
    assert won.reindex(CODES, fill_value=0).tolist() == truth.loc[CODES].tolist()


def test_the_race_is_close_and_no_party_passes_the_line_alone() -> None:
    seats = pd.read_csv(FOLDER / "truth" / "seats_won.csv").set_index("code")["seats"]
    assert seats.max() < 101
    assert 96 <= seats[["HU", "WS", "SH"]].sum() <= 106
    votes = pd.read_csv(FOLDER / "result_outcome.csv")[CODES].fillna(0)
    shares = votes.div(votes.sum(axis=1), axis=0).to_numpy()
    shares.sort(axis=1)
    assert (shares[:, -1] - shares[:, -2] < 0.02).sum() >= 10


def test_every_party_has_its_own_colour() -> None:
    colours = [p.colour for p in LAKE_PROVINCES.parties] + [a.colour for a in LAKE_PROVINCES.alliances]
    assert None not in colours
    assert len(set(colours)) == len(colours)


def test_seat_names_are_unique() -> None:
    names = [name for region in LAKE_PROVINCES.regions for name in region.seat_names]
    assert len(names) == 200 == len(set(names))
