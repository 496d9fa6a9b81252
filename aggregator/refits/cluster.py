"""Where fits are made: processes of this machine, or a Dask cluster that is already there."""

from __future__ import annotations

import logging
import socket
import tempfile
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager

import dask
from distributed import Client, LocalCluster, Security
from distributed.comm import parse_address, parse_host_port

from aggregator.errors import MachineError, UsageError
from aggregator.estimate.cores import usable_cores

# A worker may die this often under one fit before the fit is given up.
RETRIES = 2
SECONDS_TO_CONNECT = 20
SECONDS_TO_FIND_A_WORKER = 60

_TALKATIVE = ("distributed", "tornado", "asyncio")
_QUIET = {
    # A worker says nothing on its own; what matters comes back as an error.
    "logging": dict.fromkeys(_TALKATIVE, "critical"),
    # Dask's ports for browsers answer nothing.
    "distributed.scheduler.http.routes": [],
    "distributed.worker.http.routes": [],
    # A fit that compiles may keep a process from answering for a while.
    "distributed.scheduler.worker-ttl": "1h",
    "distributed.scheduler.allowed-failures": RETRIES,
    "distributed.comm.timeouts.connect": f"{SECONDS_TO_CONNECT}s",
    # Records are small; a worker needs no eye on its memory but the system's own.
    "distributed.worker.memory.target": False,
    "distributed.worker.memory.spill": False,
    "distributed.worker.memory.pause": False,
    "distributed.worker.memory.terminate": False,
}


@contextmanager
def open_cluster(*, scheduler: str | None, workers: int | None) -> Iterator[Client]:
    """Connect to a cluster for the time of a block.

    Parameters
    ----------
    scheduler
        Address of the scheduler of a cluster that is there, such as ``tls://10.0.0.5:8786``; its
        certificates are taken from Dask's configuration. None starts processes on this machine, which listen
        on this machine alone and talk to no one without this run's own certificate.
    workers
        Processes of this machine; None takes one per usable core.

    Raises
    ------
    UsageError
        If ``scheduler`` is no address, or ``workers`` is given for a cluster that is there.
    MachineError
        If no scheduler answers, or it has no workers.
    """
    if scheduler is not None and workers is not None:
        raise UsageError("--workers sets processes of this machine; a cluster has its own. Leave one out.")
    if workers is not None and workers < 1:
        raise UsageError(f"--workers {workers}: give 1 or more.")
    with ExitStack() as stack:
        stack.enter_context(dask.config.set(_QUIET))
        stack.enter_context(_quiet_logs())
        if scheduler is None:
            client = _start_here(workers or usable_cores(), stack)
        else:
            client = stack.enter_context(_connect(scheduler))
            _find_workers(client, scheduler)
        yield client


def _start_here(workers: int, stack: ExitStack) -> Client:
    scratch = stack.enter_context(tempfile.TemporaryDirectory(ignore_cleanup_errors=True))
    security = Security.temporary()
    try:
        cluster = stack.enter_context(
            LocalCluster(
                n_workers=workers,
                threads_per_worker=1,
                processes=True,
                host="127.0.0.1",
                protocol="tls",
                security=security,
                # Without a dashboard the scheduler still opens a port for it: one of the system's choice.
                dashboard_address=None,
                scheduler_kwargs={"dashboard_address": "127.0.0.1:0"},
                memory_limit=0,
                local_directory=scratch,
                silence_logs=logging.CRITICAL,
            )
        )
        return stack.enter_context(Client(cluster, set_as_default=False))
    except (OSError, RuntimeError) as error:
        raise MachineError(
            f"Worker processes could not be started on this machine: {str(error).rstrip('.')}. A script of "
            'your own must make fits below `if __name__ == "__main__":`.'
        ) from error


def _connect(scheduler: str) -> Client:
    silent = MachineError(
        f"No Dask scheduler answers at {scheduler}. Is it running, and may this machine reach it? "
        "Without --scheduler the fits are made on this machine."
    )
    try:
        _knock(scheduler)
        return Client(scheduler, timeout=SECONDS_TO_CONNECT, set_as_default=False)
    except (OSError, TimeoutError) as error:
        raise silent from error
    except (ValueError, TypeError) as error:
        raise UsageError(
            f"--scheduler {scheduler}: {error}. Give an address such as tcp://127.0.0.1:8786."
        ) from error


def _knock(scheduler: str) -> None:
    """See whether anything listens at an address: a client would try for long, and be slow to give up."""
    scheme, place = parse_address(scheduler)
    if scheme in ("tcp", "tls"):
        with socket.create_connection(parse_host_port(place), timeout=SECONDS_TO_CONNECT):
            pass


def _find_workers(client: Client, scheduler: str) -> None:
    try:
        client.wait_for_workers(1, timeout=SECONDS_TO_FIND_A_WORKER)
    except TimeoutError as error:
        raise MachineError(
            f"The scheduler at {scheduler} has no workers. Start some (dask worker {scheduler} --nthreads 1)."
        ) from error


@contextmanager
def _quiet_logs() -> Iterator[None]:
    """Keep the libraries' own words off the screen: what matters is raised as an error of ours."""
    known = logging.root.manager.loggerDict
    loggers = [logging.getLogger(name) for name in known if name.split(".")[0] in _TALKATIVE]
    levels = [logger.level for logger in loggers]
    for logger in loggers:
        logger.setLevel(logging.CRITICAL + 1)
    try:
        yield
    finally:
        for logger, level in zip(loggers, levels, strict=True):
            logger.setLevel(level)
