"""Replays: their dates, what each date knows, what is refused before anything is fitted, what is left."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from datetime import date, timedelta
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from aggregator.errors import InputError, MachineError, UsageError
from aggregator.refits.fit_record import FitRecord
from aggregator.refits.fit_task import FitTask
from aggregator.refits.pace import Pace
from aggregator.replays.replay import replay
from aggregator.replays.replay_dates import ReplaySpan, read_end, read_step, replay_dates
from aggregator.replays.replay_plan import find_contests, plan_replays
from aggregator.settings import RunSettings
from tests.inputs.desk_folder import CONTEST, write_folder

VOTE = date(2031, 5, 18)
AFTER = date(2031, 6, 1)
OUTCOME = """\
seat,name,region,HU,UP,OL,OTH
N1,Northgate,NORTH,9000,7000,,900
N2,Pier Head,NORTH,9900,5000,,800
M1,Mereside,MERE,6000,6400,5000,700
M2,Old Orchard,MERE,4800,5300,8000,600
M3,Stonebridge,MERE,5500,8200,4000,800
"""


def days(count: int) -> timedelta:
    return timedelta(days=count)


def test_dates_count_back_from_the_last_one():
    span = ReplaySpan(every=days(7), first=date(2031, 4, 1), last=date(2031, 4, 30))
    found = replay_dates(span, polling_day=VOTE)
    assert [d.isoformat() for d in found] == [
        "2031-04-02",
        "2031-04-09",
        "2031-04-16",
        "2031-04-23",
        "2031-04-30",
    ]


def test_ends_may_be_given_as_days_before_polling_day():
    found = replay_dates(ReplaySpan(every=days(28), first=days(84), last=days(0)), polling_day=VOTE)
    assert [(VOTE - d).days for d in found] == [84, 56, 28, 0]


def test_a_contest_under_way_is_replayed_up_to_today():
    today = date(2031, 4, 30)
    assert replay_dates(ReplaySpan(), polling_day=VOTE, today=today)[-1] == today
    with pytest.raises(UsageError, match=r"--to 2031-05-01 lies in the future: name today \(2031-04-30\)"):
        replay_dates(ReplaySpan(last=date(2031, 5, 1)), polling_day=VOTE, today=today)


@pytest.mark.parametrize(
    ("span", "message"),
    [
        (
            ReplaySpan(last=date(2031, 5, 19)),
            r"--to 2031-05-19 lies after polling day \(2031-05-18\): name th",
        ),
        (
            ReplaySpan(first=days(1), last=days(8)),
            "--from 2031-05-17 lies after --to 2031-05-10: name an earl",
        ),
        (ReplaySpan(every=days(0)), "--every 0d: give a number of days above zero"),
    ],
)
def test_dates_that_cannot_work_are_refused_with_what_to_do(span, message):
    with pytest.raises(UsageError, match=message):
        replay_dates(span, polling_day=VOTE)


def test_steps_and_ends_are_read_as_people_write_them():
    assert (read_step("7d", option="--every"), read_step(" 4W", option="--every")) == (days(7), days(28))
    assert read_end("2031-04-01", option="--to") == date(2031, 4, 1)
    assert (read_end("26w", option="--to"), read_end("0d", option="--to")) == (days(182), days(0))
    for text in ("0d", "7", "week", "-7d", ""):
        with pytest.raises(UsageError, match=f"--every {text}: give a number of days or weeks above zero"):
            read_step(text, option="--every")
    with pytest.raises(
        UsageError, match="--from April: give a day such as 2031-03-01, or days or weeks befo"
    ):
        read_end("April", option="--from")


def plan(folder: Path, **options: object):
    span = ReplaySpan(**{"every": days(14), "first": days(98), "last": days(14)} | options)
    return plan_replays(find_contests(folder), span=span, settings=RunSettings(), today=AFTER)


def test_each_date_is_fitted_with_the_polls_published_by_then(tmp_path):
    (found,) = plan(write_folder(tmp_path / "lakes"))
    assert found.too_early == ()
    polls = {day: set(known["poll"]) for day, known in found.polls_as_of.items()}
    assert [sorted(known) for known in polls.values()] == [
        ["T-1"], ["T-1"], ["K-1", "T-1"], ["K-1", "M-1", "T-1"], ["K-1", "M-1", "T-1"],
        ["K-1", "M-1", "T-1"], ["K-1", "K-2", "M-1", "T-1"],
    ]  # fmt: skip
    assert [t.inputs.run_date for t in found.tasks] == list(found.dates) == list(polls)
    assert len({t.key for t in found.tasks}) == 7
    assert (found.outcome, len(found.inputs.polls)) == (None, 5)


def test_dates_before_the_first_poll_are_left_out_and_named(tmp_path):
    (found,) = plan(write_folder(tmp_path / "lakes"), first=days(126))
    assert [d.isoformat() for d in found.too_early] == ["2031-01-12", "2031-01-26"]
    assert found.dates[0] == date(2031, 2, 9)


def test_a_replay_that_ends_before_the_first_poll_is_refused(tmp_path):
    folder = write_folder(tmp_path / "lakes")
    message = (
        r"lakes: the replay ends on 2031-02-01, before the first poll that can be used \(published 2031-0"
    )
    with pytest.raises(UsageError, match=message):
        plan(folder, first=days(140), last=date(2031, 2, 1))


def test_an_outcome_with_another_party_stops_a_replay(tmp_path):
    folder = write_folder(tmp_path / "lakes", result_outcome_csv=OUTCOME.replace("OL", "NEW"))
    with pytest.raises(
        InputError, match=r"result_outcome\.csv, row 1, column NEW: found a column of this nam"
    ):
        plan(folder)


def test_findings_of_all_contests_come_at_once_each_with_its_folder(tmp_path):
    for name in ("east", "west"):
        write_folder(tmp_path / name, result_outcome_csv=OUTCOME.replace("9000", "-1"))
    with pytest.raises(InputError) as caught:
        plan(tmp_path)
    assert [p.file for p in caught.value.problems] == ["east/result_outcome.csv", "west/result_outcome.csv"]


def test_a_folder_without_a_contest_is_no_place_for_a_replay(tmp_path):
    for folder in (tmp_path, tmp_path / "nowhere"):
        with pytest.raises(InputError, match=r"found no contest\.toml, here or one folder down"):
            find_contests(folder)


@dataclass
class Refits:
    """Stands in for the engine: records of the form that fits leave, made in no time."""

    failing: tuple[str, ...] = ()
    ends_with: Exception | None = None
    asked: list[FitTask] = field(default_factory=list)
    store: Path | None = None

    def run_tasks(
        self, tasks: list[FitTask], *, store: Path, scheduler, workers, progress
    ) -> Iterator[FitRecord]:
        self.asked, self.store = tasks, store
        (store / "fits").mkdir(parents=True, exist_ok=True)
        for made, task in enumerate(tasks, start=1):
            if self.ends_with is not None:
                raise self.ends_with
            progress(Pace(made, len(tasks), 0, 2, 4.0 * (len(tasks) - made)))
            yield FitRecord(task.key, self._data(task), self._facts(task))

    def _data(self, task: FitTask) -> xr.Dataset:
        contest, last = task.inputs.contest, task.inputs.last_result
        parties, regions = list(contest.party_codes), list(contest.region_codes)
        rng = np.random.default_rng(task.inputs.run_date.toordinal())
        support = rng.dirichlet([40, 35, 15, 10], (100, len(regions)))
        won = rng.multinomial(len(last), [0.4, 0.4, 0.2, 0.0], 100)
        return xr.Dataset(
            {
                "national_support": (("draw", "party"), support.mean(axis=1)),
                "national_support_polling_day": (("draw", "party"), support.mean(axis=1)),
                "support_polling_day": (("draw", "region", "party"), support),
                "seats_polling_day": (("draw", "party"), won.astype(np.int16)),
                "seat_chance": (("seat", "party"), np.tile([0.4, 0.4, 0.2, 0.0], (len(last), 1))),
                "expected_error": (("age", "code"), np.full((91, len(parties)), 3.0)),
            },
            coords={
                "party": parties,
                "code": parties,
                "region": regions,
                "seat": last["seat"].tolist(),
                "seat_region": ("seat", last["region"].tolist()),
                "age": np.arange(91),
            },
        )

    def _facts(self, task: FitTask) -> dict[str, object]:
        day = task.inputs.run_date.isoformat()
        return {
            "as_of": day,
            "polling_day": task.inputs.contest.last_polling_day.isoformat(),
            "seed": task.settings.seed,
            "passed": day not in self.failing,
            "verdict": "All checks passed." if day not in self.failing else "Checks failed.",
            "divergences": 0,
            "worst_rhat": 1.002,
            "least_tail_ess": 900.0,
            "polls_used": int(task.inputs.polls["poll"].nunique()),
            "last_fieldwork": task.inputs.polls["end"].max().date().isoformat(),
            "seconds": {"build": 1.0, "sampling": 3.0, "all": 4.0},
            "reused_compilation": True,
            "version": "fieldfold",
        }


@pytest.fixture
def refits(monkeypatch: pytest.MonkeyPatch) -> Refits:
    stub = Refits()
    monkeypatch.setattr("aggregator.replays.replay.run_tasks", stub.run_tasks)
    return stub


SPAN = ReplaySpan(every=days(28), first=days(70), last=days(14))


def test_a_replay_with_an_outcome_leaves_fits_and_a_report(tmp_path, refits):
    folder = write_folder(tmp_path / "lakes", result_outcome_csv=OUTCOME)
    told: list[tuple[str, float]] = []
    found = replay(folder, span=SPAN, today=AFTER, progress=lambda *said: told.append(said))
    assert found.out == refits.store == folder / "replays" / "2031-03-09_2031-05-04"
    assert (found.dates, found.made, found.workers, found.failed) == (3, 3, 2, ())
    assert [p.is_file() for p in found.pages] == [True]
    assert found.notices == ()
    assert ("fit 2 of 3, about 4 s left", 2 / 3) in told
    assert found.costs.seconds_for(1000, workers=2) == 2000


def test_a_replay_without_an_outcome_keeps_its_fits_and_says_so(tmp_path, refits):
    refits.failing = ("2031-04-06",)
    found = replay(write_folder(tmp_path / "lakes"), span=SPAN, out=tmp_path / "out", today=AFTER)
    assert (found.pages, found.failed) == ((), (("lakes", date(2031, 4, 6)),))
    assert found.notices == ("lakes: no result_outcome.csv, so its fits are kept and not scored.",)


def test_a_folder_of_contests_is_pooled_and_leaves_a_record(tmp_path, refits, monkeypatch):
    # The reports themselves are looked at elsewhere.
    monkeypatch.setattr(
        "aggregator.replays.replay.write_replay_report", lambda *_, inputs, out: out / "report" / "index.html"
    )
    monkeypatch.setattr(
        "aggregator.replays.replay.write_pooled_report", lambda _, *, out: out / "report" / "index.html"
    )
    (tmp_path / "past").mkdir()
    for name in ("east", "west"):
        title = CONTEST.replace("Lake Provinces 2031", f"{name} 2031")
        write_folder(tmp_path / "past" / name, contest_toml=title, result_outcome_csv=OUTCOME)
    record = tmp_path / "record.csv"
    found = replay(tmp_path / "past", span=SPAN, past_errors=record, today=AFTER)
    assert (found.contests, found.dates) == (("east", "west"), 6)
    assert found.out == tmp_path / "past" / "replays" / "70d_14d"
    assert [p.relative_to(found.out).parts[0] for p in found.pages] == ["east", "west", "report"]
    assert record.read_text().startswith("election,code,polled,result")


def test_what_cannot_work_is_said_before_anything_is_fitted(tmp_path, refits):
    lakes = write_folder(tmp_path / "lakes")
    (tmp_path / "taken.csv").write_text("mine")
    (tmp_path / "holiday").mkdir()
    (tmp_path / "holiday" / "photo.png").write_text("")
    for options, message in (
        ({"past_errors": tmp_path / "new.csv"}, r"--past-errors needs an outcome: add result_outcome\.csv"),
        ({"out": tmp_path / "holiday"}, "holiday holds something that is not a replay; name another folder"),
        ({"out": tmp_path / "taken.csv"}, r"taken\.csv is a file; name a folder"),
    ):
        with pytest.raises(UsageError, match=message):
            replay(lakes, span=SPAN, today=AFTER, **options)
    write_folder(lakes, result_outcome_csv=OUTCOME)
    with pytest.raises(UsageError, match=r"taken\.csv exists already; name a new file"):
        replay(lakes, span=SPAN, today=AFTER, past_errors=tmp_path / "taken.csv")
    for name in ("one", "two"):
        write_folder(tmp_path / name)
    with pytest.raises(UsageError, match='Two contests are called "Assembly of the Lake Provinces 2031"'):
        replay(tmp_path, span=SPAN, today=AFTER)
    assert refits.asked == []


def test_trouble_of_the_machine_goes_through_and_no_report_is_written(tmp_path, refits):
    folder = write_folder(tmp_path / "lakes", result_outcome_csv=OUTCOME)
    refits.ends_with = MachineError("No space left. Finished fits are kept.")
    with pytest.raises(MachineError):
        replay(folder, span=SPAN, out=tmp_path / "out", today=AFTER)
    assert [p.name for p in (tmp_path / "out").iterdir()] == ["fits"]
