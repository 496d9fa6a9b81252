"""Work shared out over the machine's cores, in processes forked from this one."""

from __future__ import annotations

import multiprocessing
import os
import signal
import warnings
from collections.abc import Callable, Sequence
from multiprocessing.connection import Connection

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
    context = multiprocessing.get_context("fork")
    processes, receivers = [], []
    for part in parts:
        receiver, sender = context.Pipe(duplex=False)
        process = context.Process(target=_send, args=(work, part, sender), daemon=True)
        with warnings.catch_warnings():
            # Python warns of fork beside threads; the child touches none of the parent's threads.
            warnings.simplefilter("ignore", DeprecationWarning)
            process.start()
        sender.close()
        processes.append(process)
        receivers.append(receiver)
    try:
        return [receiver.recv() for receiver in receivers]
    except EOFError as error:
        raise MachineError("A process ended early. Free some memory, or run again.") from error
    finally:
        for process in processes:
            process.terminate()
            process.join()


def _send[Part, Result](work: Callable[[Part], Result], part: Part, sender: Connection) -> None:
    # An interrupt is left to the parent, which ends its processes.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    sender.send(work(part))
    sender.close()
