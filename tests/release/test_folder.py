"""One folder per release: whole or not at all, under a name nobody else has."""

import errno
import os
import signal
import subprocess
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from datetime import date
from pathlib import Path

import pytest

from aggregator.errors import MachineError, UsageError
from aggregator.release.folder import UNFINISHED, check_place_is_free, write_folder

DAY = date(2031, 4, 2)
REPOSITORY = Path(__file__).parents[2]
SLOW_WRITER = """
import sys, time
from datetime import date
from pathlib import Path
from aggregator.release.folder import write_folder

def fill(folder):
    (folder / "half.csv").write_text("half")
    print("writing", flush=True)
    time.sleep(float(sys.argv[2]))
    (folder / "whole.csv").write_text("whole")

contest = Path(sys.argv[1])
print(write_folder(fill, contest_folder=contest, run_date=date(2031, 4, 2), passed=True, out=None).name)
"""


def fill(folder: Path) -> None:
    (folder / "table.csv").write_text("a\n1\n")


def write(contest: Path, *, passed: bool = True, out: Path | None = None) -> Path:
    return write_folder(fill, contest_folder=contest, run_date=DAY, passed=passed, out=out)


def left_behind(contest: Path) -> list[str]:
    return [path.name for path in contest.glob(f"{UNFINISHED}*")]


def start_writer(contest: Path, seconds: float) -> subprocess.Popen[str]:
    return subprocess.Popen(
        [sys.executable, "-c", SLOW_WRITER, str(contest), str(seconds)],
        cwd=REPOSITORY,
        stdout=subprocess.PIPE,
        text=True,
    )


def test_later_runs_of_a_day_get_the_next_number(tmp_path):
    names = [write(tmp_path).relative_to(tmp_path).as_posix() for _ in range(3)]
    assert names == ["releases/2031-04-02", "releases/2031-04-02-02", "releases/2031-04-02-03"]
    assert left_behind(tmp_path) == []


def test_a_release_whose_checks_failed_is_kept_apart(tmp_path):
    write(tmp_path)
    assert write(tmp_path, passed=False).relative_to(tmp_path).as_posix() == "releases/failed/2031-04-02"


def test_two_processes_at_once_both_succeed_under_different_names(tmp_path):
    writers = [start_writer(tmp_path, 0.3) for _ in range(2)]
    names = {writer.communicate(timeout=60)[0].split()[-1] for writer in writers}
    assert names == {"2031-04-02", "2031-04-02-02"}
    for name in names:
        assert sorted(p.name for p in (tmp_path / "releases" / name).iterdir()) == ["half.csv", "whole.csv"]


def test_eight_writers_at_once_claim_eight_names(tmp_path):
    with ThreadPoolExecutor(8) as pool:
        places = list(pool.map(lambda _: write(tmp_path), range(8)))
    assert len(set(places)) == 8
    assert all((place / "table.csv").exists() for place in places)


@pytest.mark.parametrize("stop", [signal.SIGKILL, signal.SIGTERM])
def test_a_killed_process_leaves_nothing_under_releases(tmp_path, stop):
    writer = start_writer(tmp_path, 60)
    assert writer.stdout is not None
    assert writer.stdout.readline() == "writing\n"
    writer.send_signal(stop)
    writer.communicate(timeout=60)
    assert list((tmp_path / "releases").iterdir()) == []


def test_what_a_killed_process_left_is_swept_away_by_the_next_run(tmp_path):
    writer = start_writer(tmp_path, 60)
    assert writer.stdout is not None
    writer.stdout.readline()
    writer.kill()
    writer.communicate(timeout=60)
    assert len(left_behind(tmp_path)) == 1
    write(tmp_path)
    assert left_behind(tmp_path) == []


def test_a_run_still_at_work_is_not_swept_away(tmp_path):
    writer = start_writer(tmp_path, 1.5)
    assert writer.stdout is not None
    writer.stdout.readline()
    write(tmp_path)
    assert len(left_behind(tmp_path)) == 1
    assert writer.communicate(timeout=60)[0].split() == ["2031-04-02-02"]


def test_ctrl_c_leaves_nothing_at_all(tmp_path):
    writer = start_writer(tmp_path, 60)
    assert writer.stdout is not None
    writer.stdout.readline()
    time.sleep(0.1)
    writer.send_signal(signal.SIGINT)
    writer.communicate(timeout=60)
    assert [path.name for path in tmp_path.rglob("*")] == ["releases"]


def test_an_error_while_writing_leaves_nothing_at_all(tmp_path):
    def fail(folder: Path) -> None:
        fill(folder)
        raise ValueError("a mistake in the program")

    with pytest.raises(ValueError, match="a mistake"):
        write_folder(fail, contest_folder=tmp_path, run_date=DAY, passed=True, out=None)
    assert [path.name for path in tmp_path.rglob("*")] == ["releases"]


def test_a_full_disk_is_a_machine_error_that_says_so(tmp_path):
    def fail(folder: Path) -> None:
        fill(folder)
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC), str(folder / "draws.nc"))

    with pytest.raises(MachineError, match="disk is full") as caught:
        write_folder(fail, contest_folder=tmp_path, run_date=DAY, passed=True, out=None)
    assert caught.value.exit_code == 5
    assert left_behind(tmp_path) == []


def test_a_place_that_cannot_be_written_is_a_machine_error(tmp_path):
    (tmp_path / "releases").write_text("a file where a folder should be")
    with pytest.raises(MachineError, match="could not be written"):
        write(tmp_path)


def test_a_chosen_place_is_used_and_a_filled_one_refused(tmp_path):
    out = tmp_path / "looks" / "back"
    assert write(tmp_path, out=out) == out
    assert (out / "table.csv").exists()
    with pytest.raises(UsageError, match="already holds something"):
        write(tmp_path, out=out)
    assert not (tmp_path / "releases").exists()


def test_an_empty_folder_may_be_chosen(tmp_path):
    out = tmp_path / "empty"
    out.mkdir()
    check_place_is_free(out)
    assert write(tmp_path, out=out) == out


def test_a_file_may_not_be_chosen(tmp_path):
    out = tmp_path / "notes.txt"
    out.write_text("mine")
    with pytest.raises(UsageError):
        check_place_is_free(out)


def test_a_place_filled_while_the_release_was_made_is_left_alone(tmp_path):
    out = tmp_path / "place"

    def fill_slowly(folder: Path) -> None:
        fill(folder)
        out.mkdir()
        (out / "mine.txt").write_text("mine")

    with pytest.raises(UsageError, match="someone else"):
        write_folder(fill_slowly, contest_folder=tmp_path, run_date=DAY, passed=True, out=out)
    assert (out / "mine.txt").read_text() == "mine"
    assert left_behind(tmp_path) == []


def test_a_release_may_be_read_by_whoever_may_read_the_contest_folder(tmp_path):
    place = write(tmp_path)
    assert place.stat().st_mode & 0o777 == (tmp_path / "releases").stat().st_mode & 0o777
