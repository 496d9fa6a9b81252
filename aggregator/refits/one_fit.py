"""One fit, made in the process of a worker: chains one after the other, no process of its own."""

from __future__ import annotations

import threading
from dataclasses import asdict, dataclass, field
from time import perf_counter

from threadpoolctl import threadpool_limits

from aggregator.errors import MachineError
from aggregator.estimate.compiled_election import CompiledElection
from aggregator.estimate.fit import compile_contest, fit_compiled
from aggregator.refits.fit_record import FitRecord, build_data, build_facts, list_standing_out
from aggregator.refits.fit_task import FitTask
from aggregator.refits.program_version import program_version


@dataclass
class CompileCache:
    """The last compiled election of this process: the next fit of the same contest need not compile.

    Its numbers are overwritten by each fit, so one fit at a time may hold the lock.
    """

    lock: threading.Lock = field(default_factory=threading.Lock)
    election: CompiledElection | None = None


compile_cache = CompileCache()


class _Stopwatch:
    """Seconds by stage, told of each stage by the fit's progress."""

    def __init__(self, stage: str) -> None:
        self.seconds: dict[str, float] = {}
        self._stage, self._since = stage, perf_counter()

    def __call__(self, stage: str, _part: float = 0.0) -> None:
        now = perf_counter()
        self.seconds[self._stage] = self.seconds.get(self._stage, 0.0) + now - self._since
        self._stage, self._since = stage, now


def make_fit(task: FitTask, *, version: str) -> FitRecord:
    """Make the fit of a task.

    Parameters
    ----------
    task
        What to fit.
    version
        The program of whoever asks; see `program_version`.

    Raises
    ------
    MachineError
        If this process runs another program: its numbers would not be the same.
    """
    if version != program_version():
        raise MachineError(
            "A worker runs another program, so its numbers would not be the same. Install the same versions "
            f"there, and start it again.\n  here:   {version}\n  worker: {program_version()}"
        )
    with compile_cache.lock, threadpool_limits(1):
        clock = _Stopwatch("build")
        before = compile_cache.election
        contest = compile_contest(task.inputs, like=before)
        compile_cache.election = contest.election
        reused = before is not None and contest.election.density.compiled is before.density.compiled
        fit = fit_compiled(
            contest,
            settings=task.settings,
            weigh_polls=False,
            whole_series=False,
            processes=1,
            progress=clock,
        )
        clock("gathering")
        data = build_data(task.inputs, fit)
        tested = {"stands_out": list_standing_out(task.inputs, fit)} if task.test_figures else {}
        clock("end")
    seconds = {
        "build": clock.seconds["build"],
        "sampling": clock.seconds["drawing from the model"],
        "all": sum(clock.seconds.values()),
    }
    facts = build_facts(task.inputs, fit, asked=asdict(task.settings))
    return FitRecord(task.key, data, facts | tested | {"seconds": seconds, "reused_compilation": reused})
