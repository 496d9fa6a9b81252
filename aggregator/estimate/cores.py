"""Work shared out over the machine's cores, in processes forked from this one."""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
import warnings
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from functools import partial
from multiprocessing.connection import Connection
from multiprocessing.process import BaseProcess

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
    with forked([partial(_send, work, part) for part in parts]) as receivers:
        try:
            return [receiver.recv() for receiver in receivers]
        except EOFError as error:
            raise MachineError("A process ended early. Free some memory, or run again.") from error


@contextmanager
def forked(jobs: Sequence[Callable[[Connection], None]]) -> Iterator[list[Connection]]:
    """Run each job in a forked process that sends through a pipe, and end them all at the end of the block.

    Parameters
    ----------
    jobs
        Each is called in its process with the end of a pipe to send into.

    Yields
    ------
    The other ends, in the order of the jobs.
    """
    context = multiprocessing.get_context("fork")
    processes, receivers = [], []
    try:
        for job in jobs:
            receiver, sender = context.Pipe(duplex=False)
            process = context.Process(target=_follow, args=(job, sender), daemon=True)
            with warnings.catch_warnings():
                # Python warns of fork beside threads; the child touches none of the parent's threads.
                warnings.simplefilter("ignore", DeprecationWarning)
                process.start()
            sender.close()
            processes.append(process)
            receivers.append(receiver)
        yield receivers
    finally:
        for process in processes:
            process.terminate()
            process.join()


def _follow(job: Callable[[Connection], None], sender: Connection) -> None:
    _follow_parent()
    job(sender)


def _follow_parent() -> None:
    """Leave interrupts to the parent, and end this process when the parent ends, even if that was killed.

    A pipe does not tell: forked processes hold copies of both its ends, and one that writes into a pipe
    nobody reads waits for ever once it is full.
    """
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_end_after, args=(parent,), daemon=True).start()


def _end_after(parent: BaseProcess) -> None:
    parent.join()
    os._exit(1)


def _send[Part, Result](work: Callable[[Part], Result], part: Part, sender: Connection) -> None:
    sender.send(work(part))
    sender.close()
