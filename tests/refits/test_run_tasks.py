"""Many fits give the same records however many workers make them, and whatever befalls the workers.

A worker compiles anew, so the runs are few: each is looked at from several sides.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np
import psutil
import pytest
from distributed import LocalCluster

from aggregator.errors import MachineError, UsageError
from aggregator.estimate.fit import compile_contest, fit_compiled
from aggregator.refits.fit_record import FitRecord
from aggregator.refits.fit_task import FitTask
from aggregator.refits.one_fit import compile_cache, make_fit
from aggregator.refits.pace import Pace
from aggregator.refits.run_tasks import run_tasks
from tests.refits.tiny_tasks import SHORT, assert_same, tiny_tasks, write_tiny_contest


@pytest.fixture(scope="module")
def tasks(tmp_path_factory: pytest.TempPathFactory) -> list[FitTask]:
    return tiny_tasks(write_tiny_contest(tmp_path_factory.mktemp("tiny") / "contest"))


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("store")


@pytest.fixture(scope="module")
def by_two(tasks: list[FitTask], store: Path) -> list[FitRecord]:
    return list(run_tasks(tasks, store=store, workers=2))


def worker_processes() -> list[psutil.Process]:
    return [p for p in psutil.Process().children() if "spawn_main" in " ".join(p.cmdline())]


def test_records_come_in_the_order_of_the_tasks_and_hold_what_they_say(tasks, by_two, store):
    assert [r.key for r in by_two] == [t.key for t in tasks]
    assert {p.stem for p in (store / "fits").iterdir()} == {t.key for t in tasks}
    for record, task in zip(by_two, tasks, strict=True):
        data, facts = record.data, record.facts
        assert data.sizes["draw"] <= 1000
        for name in ("national_support", "national_support_polling_day", "support_polling_day"):
            assert np.allclose(data[name].sum("party"), 1, atol=1e-5), name
        assert (data["seats_polling_day"].sum("party") == 12).all()
        assert np.allclose(data["seat_chance"].sum("party"), 1)
        assert (data["expected_error"].diff("age") >= 0).all()
        assert facts["as_of"] == task.inputs.run_date.isoformat()
        assert facts["last_fieldwork"] <= facts["as_of"] <= facts["polling_day"] == "2030-06-02"
        assert facts["polls_used"] == task.inputs.polls["poll"].nunique()
        assert 0 < facts["seconds"]["sampling"] < facts["seconds"]["all"]
        assert facts["settings"]["draws"] == SHORT.draws


def test_a_killed_worker_is_replaced_and_one_worker_makes_the_same_records(tasks, by_two, tmp_path):
    paces: list[Pace] = []
    killed: list[int] = []

    def kill_in_the_middle_of_a_fit() -> None:
        (worker,) = worker_processes()
        killed.append(worker.pid)
        os.kill(worker.pid, signal.SIGKILL)

    def watch(pace: Pace) -> None:
        paces.append(pace)
        if pace.finished == 0:
            threading.Timer(2.0, kill_in_the_middle_of_a_fit).start()

    by_one = list(run_tasks(tasks, store=tmp_path, workers=1, progress=watch))
    assert len(killed) == 1
    for one, two in zip(by_one, by_two, strict=True):
        assert_same(one, two)
    assert sorted(r.facts["reused_compilation"] for r in by_one) == [False, True, True]
    assert [(p.finished, p.total, p.found) for p in paces] == [(n, 3, 0) for n in range(4)]
    assert paces[0].seconds_left is None and paces[-1].seconds_left == 0


def test_finished_fits_are_read_and_no_worker_is_started(tasks, by_two, store, monkeypatch):
    monkeypatch.setattr("aggregator.refits.run_tasks.open_cluster", None)
    paces: list[Pace] = []
    again = list(run_tasks([*tasks, tasks[0]], store=store, progress=paces.append))
    for one, two in zip(again, [*by_two, by_two[0]], strict=True):
        assert_same(one, two)
    assert [(p.finished, p.total, p.found) for p in paces] == [(3, 3, 3)]


def test_a_cluster_that_is_there_makes_the_same_records_and_so_does_a_refresh(tasks, by_two, tmp_path):
    """The cluster's worker is a thread of this process, so that the refresh can use its compilation."""
    with LocalCluster(
        n_workers=1, threads_per_worker=2, processes=False, protocol="tcp", host="127.0.0.1",
        dashboard_address="127.0.0.1:0", local_directory=tmp_path / "scratch",
    ) as cluster:  # fmt: skip
        address = cluster.scheduler_address
        there = list(run_tasks(tasks[1:], store=tmp_path, scheduler=address))
    for one, two in zip(there, by_two[1:], strict=True):
        assert_same(one, two)
    contest = compile_contest(tasks[0].inputs, like=compile_cache.election)
    fit = fit_compiled(contest, settings=SHORT)
    whole = fit.draws["national_support_polling_day"].to_numpy().reshape(-1, 4)
    assert np.array_equal(by_two[0].data["national_support_polling_day"].to_numpy(), whole)


def test_a_scheduler_that_dies_in_the_middle_is_named_and_finished_fits_are_kept(tasks, by_two, tmp_path):
    with LocalCluster(
        n_workers=1, threads_per_worker=1, processes=False, protocol="tcp", host="127.0.0.1",
        dashboard_address="127.0.0.1:0", local_directory=tmp_path / "scratch",
    ) as cluster:  # fmt: skip

        def end_scheduler(pace: Pace) -> None:
            if pace.finished == 1:
                cluster.sync(cluster.scheduler.close)

        records = run_tasks(
            tasks, store=tmp_path, scheduler=cluster.scheduler_address, progress=end_scheduler
        )
        with pytest.raises(MachineError, match=r"The scheduler does not answer any more.*Finished fits are"):
            list(records)
    (kept,) = (tmp_path / "fits").iterdir()
    assert kept.stem == tasks[0].key


class EndsWorkers:
    """Stands in for inputs that kill whatever worker unpacks them, as a want of memory would."""

    def __reduce__(self) -> tuple[object, tuple[()]]:
        return end_if_worker, ()


def end_if_worker() -> EndsWorkers:
    """End the process if it is a worker; the scheduler of this machine's cluster lives in the parent."""
    if multiprocessing.parent_process() is not None:
        os._exit(1)
    return EndsWorkers()


def test_a_fit_that_kills_every_worker_is_given_up_and_finished_fits_are_kept(tasks, by_two, store):
    deadly = replace(tasks[0], key="deadly", inputs=EndsWorkers())
    records = run_tasks([tasks[0], deadly], store=store, workers=1)
    with pytest.raises(MachineError, match=r"3 workers died while they made deadly.*Finished fits are kept"):
        list(records)
    assert {p.stem for p in (store / "fits").iterdir()} == {t.key for t in tasks}
    assert worker_processes() == []


@pytest.mark.parametrize(
    ("options", "error", "message"),
    [
        ({"scheduler": "tcp://127.0.0.1:9"}, MachineError, "No Dask scheduler answers at tcp://127.0.0.1:9"),
        ({"scheduler": "here"}, UsageError, "--scheduler here: missing port number"),
        ({"scheduler": "tcp://127.0.0.1:9", "workers": 2}, UsageError, "--workers sets processes of this"),
        ({"workers": 0}, UsageError, "--workers 0: give 1 or more"),
    ],
)
def test_a_cluster_that_cannot_be_used_is_named_at_once(tasks, tmp_path, options, error, message):
    with pytest.raises(error, match=message):
        list(run_tasks(tasks, store=tmp_path, **options))


def test_a_worker_with_another_program_is_refused(tasks):
    with pytest.raises(
        MachineError, match=r"(?s)runs another program.*here:   fieldfold 9\n  worker: fieldf"
    ):
        make_fit(tasks[0], version="fieldfold 9")


@pytest.fixture(autouse=True, scope="module")
def leaves_nothing_behind() -> Iterator[None]:
    before = set(Path.cwd().iterdir())
    yield
    assert worker_processes() == []
    assert {p.name for p in set(Path.cwd().iterdir()) - before} <= {".pytest_cache", ".hypothesis"}
