"""Work shared out over the machine's cores, in processes forked from this one."""

from __future__ import annotations

import multiprocessing
import os
import signal
import warnings
from collections.abc import Callable, Sequence
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool

from aggregator.errors import MachineError


def usable_cores() -> int:
    """Cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def can_fork() -> bool:
    """Whether the system can fork; without it work stays in this process."""
    return "fork" in multiprocessing.get_all_start_methods()


def map_forked[Part, Result](work: Callable[[Part], Result], parts: Sequence[Part]) -> list[Result]:
    """Apply a function to each part, each in a process of its own where that helps.

    Raises
    ------
    MachineError
        If a process died.
    """
    if len(parts) == 1 or not can_fork():
        return [work(part) for part in parts]
    with ProcessPoolExecutor(
        len(parts), mp_context=multiprocessing.get_context("fork"), initializer=_ignore_interrupts
    ) as pool:
        try:
            with warnings.catch_warnings():
                # Python warns of fork beside threads; the child touches none of the parent's threads.
                warnings.simplefilter("ignore", DeprecationWarning)
                results = pool.map(work, parts)
            return list(results)
        except BrokenProcessPool as error:
            raise MachineError("A process ended early. Free some memory, or run again.") from error


def _ignore_interrupts() -> None:
    """Leave an interrupt to the parent, which ends its processes."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
