"""Work shared out over processes: same results, and a clear end when one dies."""

from __future__ import annotations

import multiprocessing
import os
from select import select
from time import sleep

import numpy as np
import pytest
import xarray as xr

from aggregator.errors import MachineError
from aggregator.estimate import sampler_checks
from aggregator.estimate.cores import can_fork, map_forked
from aggregator.estimate.sampler_checks import check_convergence


def die(_: int) -> int:
    os._exit(1)


def say_so_and_sleep(writer: int) -> None:
    os.write(writer, b".")
    sleep(600)


def test_results_come_back_in_the_order_of_the_parts() -> None:
    assert map_forked(abs, [-3, -1, -2]) == [3, 1, 2]


@pytest.mark.skipif(not can_fork(), reason="work stays in this process")
def test_a_process_that_dies_ends_the_run_with_an_error_that_says_so() -> None:
    with pytest.raises(MachineError, match="process ended early"):
        map_forked(die, [1, 2])


@pytest.mark.skipif(not can_fork(), reason="work stays in this process")
@pytest.mark.filterwarnings("ignore:.*fork:DeprecationWarning")
def test_no_worker_outlives_a_run_that_was_killed() -> None:
    reader, writer = os.pipe()
    run = multiprocessing.get_context("fork").Process(
        target=map_forked, args=(say_so_and_sleep, [writer, writer])
    )
    run.start()
    os.close(writer)
    # The pipe ends when the last process that could write into it is gone.
    assert os.read(reader, 1) + os.read(reader, 1) == b".."
    run.kill()
    ready, _, _ = select([reader], [], [], 30)
    assert ready and os.read(reader, 1) == b""
    os.close(reader)


def test_diagnostics_are_the_same_however_many_cores_share_them(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(1)
    draws = rng.normal(size=(4, 200, 250)).cumsum(axis=1) * np.arange(1, 251)
    published = xr.Dataset({"support": (("chain", "draw", "party"), draws)})
    found = []
    for cores in (1, 2):
        monkeypatch.setattr(sampler_checks, "usable_cores", lambda cores=cores: cores)
        found.append(check_convergence(published, divergences=0))
    assert found[0] == found[1]
