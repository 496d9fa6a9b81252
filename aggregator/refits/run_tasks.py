"""Many fits: those that are not there yet are made, all are handed back in their order."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from itertools import islice
from pathlib import Path
from time import monotonic
from typing import Any

from distributed import CancelledError, Client, Future, KilledWorker, wait

from aggregator.errors import MachineError
from aggregator.refits.cluster import RETRIES, SECONDS_TO_FIND_A_WORKER, open_cluster
from aggregator.refits.fit_record import FitRecord
from aggregator.refits.fit_task import FitTask
from aggregator.refits.one_fit import make_fit
from aggregator.refits.pace import Pace, measure_costs
from aggregator.refits.program_version import program_version
from aggregator.refits.record_files import has_record, make_store, read_record, write_record

# Fits handed out ahead of the workers: enough that none waits, few enough that a scheduler holds little.
AHEAD = 2
SECONDS_BETWEEN_LOOKS = 5.0
_RESUME = "Finished fits are kept: the same command goes on from them."


def run_tasks(
    tasks: Iterable[FitTask],
    *,
    store: Path,
    scheduler: str | None = None,
    workers: int | None = None,
    progress: Callable[[Pace], None] = lambda _pace: None,
) -> Iterator[FitRecord]:
    """Make fits, and hand back their records in the order of the tasks.

    A record that ``store`` holds already is read; every other one is written there the moment its fit is
    there, and read from there, so that it is the same whoever made it and when. A fit whose worker dies is
    made again by another.

    Parameters
    ----------
    tasks
        The fits; two tasks of one key are one fit.
    store
        Folder of the records: ``fits/KEY.nc`` in it.
    scheduler
        Address of a Dask scheduler; None for processes of this machine.
    workers
        Processes of this machine; None for one per usable core.
    progress
        Called whenever a fit is there, and once at the start.

    Raises
    ------
    UsageError
        If ``scheduler`` is no address, or is given together with ``workers``.
    MachineError
        If ``store`` cannot be written, the scheduler does not answer, or workers keep dying. Records
        written before stay.
    """
    tasks = list(tasks)
    make_store(store)
    return _run(tasks, store=store, scheduler=scheduler, workers=workers, progress=progress)


def _run(
    tasks: list[FitTask],
    *,
    store: Path,
    scheduler: str | None,
    workers: int | None,
    progress: Callable[[Pace], None],
) -> Iterator[FitRecord]:
    by_key = {task.key: task for task in tasks}
    there = {key for key in by_key if has_record(key, store=store)}
    missing = [task for key, task in by_key.items() if key not in there]
    found, handed_back = len(there), 0
    if missing:
        with open_cluster(scheduler=scheduler, workers=workers) as client:
            made: list[Mapping[str, Any]] = []
            progress(_pace(client, made, found=found, total=len(by_key)))
            for record in _make(client, missing):
                write_record(record, store=store)
                there.add(record.key)
                made.append(record.facts)
                progress(_pace(client, made, found=found, total=len(by_key)))
                while handed_back < len(tasks) and tasks[handed_back].key in there:
                    handed_back += 1
                    yield read_record(tasks[handed_back - 1].key, store=store)
    else:
        progress(Pace(finished=found, total=found, found=found, workers=0, seconds_left=0.0))
    for task in tasks[handed_back:]:
        yield read_record(task.key, store=store)


def _pace(client: Client, made: list[Mapping[str, Any]], *, found: int, total: int) -> Pace:
    left, at_work = total - found - len(made), _threads(client)
    seconds_left = measure_costs(made).next_seconds * left / max(at_work, 1) if made else None
    return Pace(
        finished=found + len(made), total=total, found=found, workers=at_work, seconds_left=seconds_left
    )


def _make(client: Client, tasks: list[FitTask]) -> Iterator[FitRecord]:
    """Hand tasks to the workers, a few ahead of them, and give back what is finished, in any order."""
    waiting = iter(tasks)
    at_work: dict[Future, FitTask] = {}
    while True:
        room = AHEAD + 2 * _threads(client) - len(at_work)
        for task in islice(waiting, max(room, 0)):
            future = client.submit(
                make_fit, task, version=program_version(), key=f"fit-{task.key}", pure=False
            )
            at_work[future] = task
        if not at_work:
            return
        for future in _finished(client, at_work):
            yield _result(future, at_work.pop(future))


def _finished(client: Client, at_work: Mapping[Future, FitTask]) -> list[Future]:
    """Wait until some fit is finished; good ones come first, so that they are kept whatever befell others."""
    alone_since: float | None = None
    while True:
        try:
            with client.as_current():
                done = wait(list(at_work), timeout=SECONDS_BETWEEN_LOOKS, return_when="FIRST_COMPLETED").done
        except TimeoutError:
            done = set()
        except CancelledError as error:
            raise _lost_scheduler() from error
        if done:
            return sorted(done, key=lambda future: future.status != "finished")
        if _threads(client):
            alone_since = None
            continue
        alone_since = alone_since or monotonic()
        if monotonic() - alone_since > SECONDS_TO_FIND_A_WORKER:
            raise MachineError(f"All workers are gone. Start workers again. {_RESUME}")


def _result(future: Future, task: FitTask) -> FitRecord:
    try:
        record: FitRecord = future.result()
        # A result still asked for would be made again should its worker die now.
        future.release()
    except KilledWorker as error:
        raise MachineError(
            f"{RETRIES + 1} workers died while they made {task.key}, most often for want of memory. "
            f"Take fewer --workers, or free some memory. {_RESUME}"
        ) from error
    except CancelledError as error:
        raise _lost_scheduler() from error
    except ModuleNotFoundError as error:
        raise MachineError(
            f"A worker cannot import {error.name}: install the same versions there. {_RESUME}"
        ) from error
    except OSError as error:
        raise MachineError(
            f"The worker that made {task.key} failed: {error.strerror or error}. {_RESUME}"
        ) from error
    return record


def _threads(client: Client) -> int:
    """Fits that can be made at one time."""
    if client.status != "running":
        raise _lost_scheduler()
    try:
        # One fit at a time in each process, however many threads it has.
        return len(client.nthreads())
    except (OSError, TimeoutError) as error:
        raise _lost_scheduler() from error


def _lost_scheduler() -> MachineError:
    return MachineError(f"The scheduler does not answer any more. Start it again. {_RESUME}")
