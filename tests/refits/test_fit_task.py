"""A task holds what a fit of a day reads, and nothing that came later."""

from __future__ import annotations

import pickle
import re
from dataclasses import replace
from datetime import date
from pathlib import Path

import pytest

from aggregator.refits.fit_task import FitTask, build_task
from aggregator.settings import RunSettings
from tests.inputs.desk_folder import CONTEST, POLLS, RESULT, read, write_folder

EARLIER = date(2031, 3, 20)
HEADER = POLLS.splitlines()[0]


TARROW = {"house": "Tarrow Research", "sample": "900", "HU": "30", "UP": "40"}


def poll(**cells: str) -> str:
    """One more line of the register."""
    return ",".join(cells.get(column, "") for column in HEADER.split(",")) + "\n"


def task(folder: Path, *, as_of: date | None = EARLIER, seed: int = 1, **files: str) -> FitTask:
    folder.mkdir(exist_ok=True)
    inputs = read(write_folder(folder / "c", **files), as_of=as_of)
    return build_task(inputs, name="Lake provinces 2031", settings=RunSettings(seed=seed))


LATER = {
    "a poll": {
        "polls_csv": POLLS
        + poll(end="2031-04-02", published="2031-04-03", **TARROW)
    },
    "an earlier poll that is published later": {
        "polls_csv": POLLS
        + poll(end="2031-03-01", published="2031-03-28", **TARROW)
    },
    "a poll entered above all others": {
        "polls_csv": POLLS.replace(
            HEADER + "\n",
            HEADER
            + "\n"
            + poll(house="Otter", end="2031-04-02", published="2031-04-03", sample="900", HU="30", UP="40"),
        )
    },
    "a correction": {
        "polls_csv": POLLS
        + poll(
            poll="K-1b", house="Kestrel Poll", start="2031-02-20", end="2031-02-23", published="2031-02-25",
            sample="1540", mode="online", HU="33", UP="43", OL="18", status_date="2031-04-01", replaces="K-1",
        )
    },
    "a withdrawal": {
        "polls_csv": POLLS.replace("17.9,,5.6,,,,", "17.9,,5.6,,withdrawn,2031-04-01,")
    },
    "a jolt": {"contest_toml": CONTEST + "\n[[jolt]]\ndate = 2031-04-01\n"},
    "an alliance": {
        "contest_toml": CONTEST
        + '\n[[alliance]]\ncode = "HILL"\nname = "Hill Pact"\nmembers = ["UP", "OL"]\nfrom = 2031-04-24\n'
    },
    "the end of an alliance": {
        "contest_toml": CONTEST.replace("from = 2031-01-15", "from = 2031-01-15\nuntil = 2031-04-24")
    },
    "a past election": {
        "past_errors_csv": "election,code,polled,result\n2031-04-06,HU,38,41\n2031-04-06,UP,36,34\n"
    },
    "a note and a source": {
        "polls_csv": POLLS.replace("17.9,,5.6,,,,,,,,", "17.9,,5.6,,,,,,,web,seen")
    },
    "the title and when not to publish": {
        "contest_toml": CONTEST.replace("Assembly", "Parliament").replace(
            "until = 2031-05-18", "until = 2031-05-19"
        )
    },
    "the outcome": {"result_outcome_csv": RESULT},
    "a candidate who is known later": {
        "candidates_csv": "seat,code,status_date\nN1,HU,2031-04-01\nN1,UP,2031-04-01\n"
    },
}  # fmt: skip


@pytest.mark.parametrize("change", LATER)
def test_what_came_later_changes_nothing_in_an_earlier_fit(tmp_path, change):
    before, after = task(tmp_path), task(tmp_path, **LATER[change])
    assert after.key == before.key
    assert after.inputs.polls.equals(before.inputs.polls)
    assert after.inputs.contest == before.inputs.contest


def test_a_count_published_later_changes_nothing_in_an_earlier_fit(tmp_path):
    phases = CONTEST.replace('name = "Northern Shore"', 'name = "Northern Shore"\npolling_day = 2031-05-04')
    counted = phases.replace("polling_day = 2031-05-04", "polling_day = 2031-05-04\ncounted = 2031-05-08")
    votes = "seat,region,HU,UP,OTH\nN1,NORTH,9000,7000,900\nN2,NORTH,9900,5000,800\n"
    for day, changes in ((date(2031, 5, 7), False), (date(2031, 5, 8), True)):
        before = task(tmp_path / f"{day}", as_of=day, contest_toml=phases)
        after = task(tmp_path / f"{day}c", as_of=day, contest_toml=counted, result_counted_csv=votes)
        assert (after.key != before.key) is changes


@pytest.mark.parametrize(
    "change", ["a poll", "a correction", "a withdrawal", "a jolt", "the end of an alliance"]
)
def test_once_it_is_known_it_makes_another_fit(tmp_path, change):
    late = date(2031, 4, 28)
    assert task(tmp_path, as_of=late, **LATER[change]).key != task(tmp_path, as_of=late).key


def test_figures_settings_and_days_make_another_fit(tmp_path):
    keys = {
        task(tmp_path).key,
        task(tmp_path, seed=2).key,
        task(tmp_path, as_of=date(2031, 3, 21)).key,
        task(tmp_path, polls_csv=POLLS.replace("38.4", "38.5")).key,
        task(tmp_path, result_last_csv=RESULT.replace("9120", "9121")).key,
    }
    assert len(keys) == 5


def test_the_key_is_a_file_name_that_says_what_it_is(tmp_path):
    assert re.fullmatch(r"Lake_provinces_2031-2031-03-20-[0-9a-f]{12}", task(tmp_path).key)
    inputs = read(write_folder(tmp_path / "c"), as_of=EARLIER)
    odd = build_task(inputs, name="../Ä b" + 99 * "x", settings=RunSettings())
    assert re.fullmatch(r"[A-Za-z0-9_]{1,60}-2031-03-20-[0-9a-f]{12}", odd.key)


def test_a_worker_is_sent_no_poll_that_the_fit_does_not_use_and_nothing_of_the_desk(tmp_path):
    polls = POLLS.replace("17.9,,5.6,,,,,,,,", "17.9,,5.6,,,,,,,secretsource,secretnote")
    sent = pickle.dumps(task(tmp_path, polls_csv=polls))
    for word in ("K-2", "55.5", "secretsource", "secretnote", "Lake Courier", str(tmp_path), "Zurich"):
        assert word.encode() not in sent, word
    assert b"K-1" in sent


CANDIDATES = (
    "seat,code,name,holder,status,status_date,source,note\nN1,HU,Ada Brae,yes,,,,\nN1,UP,Tam Orrin,,,,,\n"
)


def test_who_stands_where_makes_another_fit(tmp_path):
    texts = {
        "all": CANDIDATES,
        "one fewer": CANDIDATES.replace("N1,UP,Tam Orrin,,,,,\n", "N1,OTH,,,,,,\n"),
        "nobody sits": CANDIDATES.replace("yes", "no"),
        "withdrawn": CANDIDATES.replace("Tam Orrin,,,", "Tam Orrin,,withdrawn,2031-03-19"),
    }
    keys = [task(tmp_path, candidates_csv=text).key for text in texts.values()]
    assert len({*keys, task(tmp_path / "without").key}) == len(texts) + 1


def test_a_withdrawal_makes_another_fit_from_its_day_on(tmp_path):
    text = CANDIDATES.replace("Tam Orrin,,,", "Tam Orrin,,withdrawn,2031-04-01")
    for day, changes in ((date(2031, 3, 31), False), (date(2031, 4, 1), True)):
        before = task(tmp_path / f"{day}", as_of=day, candidates_csv=CANDIDATES)
        after = task(tmp_path / f"{day}w", as_of=day, candidates_csv=text)
        assert (after.key != before.key) is changes


def test_a_worker_is_sent_nobodys_name(tmp_path):
    named = task(tmp_path, candidates_csv=CANDIDATES.replace(",,,,\n", ",,,secretsource,secretnote\n"))
    sent = pickle.dumps(named)
    for word in ("Ada", "Brae", "Orrin", "secretsource", "secretnote"):
        assert word.encode() not in sent, word
    assert named.inputs.candidates.to_numpy().tolist() == [["N1", "HU", "", True], ["N1", "UP", "", False]]
    assert named.key == task(tmp_path, candidates_csv=CANDIDATES.replace("Ada Brae", "Eda Brae")).key


def test_another_program_makes_another_fit(tmp_path, monkeypatch):
    before = task(tmp_path).key
    monkeypatch.setattr("aggregator.refits.fit_task.program_version", lambda: "fieldfold 9")
    assert task(tmp_path).key != before


def test_inputs_without_a_last_result_make_a_task(tmp_path):
    inputs = replace(read(write_folder(tmp_path / "c"), as_of=EARLIER), last_result=None)
    assert build_task(inputs, name="c", settings=RunSettings()).inputs.last_result is None
