"""The weekly refresh as a desk runs it: the command in a process of its own, on a small contest folder."""

from __future__ import annotations

import csv
import json
import os
import shutil
import signal
import subprocess
import sys
from contextlib import suppress
from dataclasses import dataclass, replace
from datetime import date
from pathlib import Path
from time import monotonic, sleep

import pytest

from aggregator.release.table_schemas import ALL_SCHEMAS
from data_demo.made_up_election import SMALL_ELECTION, simulate_election
from data_demo.made_up_folder import write_contest_folder

TOP = Path(__file__).parent.parent
SMALL_CONTEST = replace(
    SMALL_ELECTION, parties=2, regions=2, seats=6, houses=2, polls=10, weeks=16, polled_weeks=12
)
# One poll of the register was published on this day, and one ended on it and was published later.
LOOK_BACK = date(2030, 5, 16)
TOO_FEW_DRAWS = 20
# More than any of these tests waits for.
ENDLESS_DRAWS = 200_000
LONGEST_SECONDS = 240


@dataclass(frozen=True)
class Ended:
    """A command that has ended, and the contest folder it worked on."""

    folder: Path
    code: int
    out: str
    err: str

    @property
    def releases(self) -> list[Path]:
        """Everything under ``releases/``, failed ones included, in order of name."""
        shelf = self.folder / "releases"
        return sorted(p for p in (*shelf.glob("*"), *shelf.glob("failed/*")) if p.name != "failed")


def contest_folder(at: Path) -> Path:
    write_contest_folder(simulate_election(1, size=SMALL_CONTEST), at)
    # Its outcome and truth are for the tests of the simulator.
    shutil.rmtree(at / "truth")
    (at / "result_outcome.csv").unlink()
    return at


def start_refresh(folder: Path, *options: object) -> subprocess.Popen[str]:
    command = [sys.executable, "-m", "aggregator", "refresh", str(folder), *(str(o) for o in options)]
    return subprocess.Popen(
        command,
        cwd=TOP,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        # A group of its own, as a terminal gives it: Ctrl-C reaches the group.
        start_new_session=True,
    )


def ended(process: subprocess.Popen[str], folder: Path) -> Ended:
    try:
        out, err = process.communicate(timeout=LONGEST_SECONDS)
    finally:
        process.kill()
    return Ended(folder, process.returncode, out, err)


def tables_of(release: Path) -> dict[str, bytes]:
    paths = [p for p in release.rglob("*.csv") if "inputs" not in p.parts]
    return {p.relative_to(release).as_posix(): p.read_bytes() for p in paths}


def rows_of(table: bytes | Path) -> list[dict[str, str]]:
    data = table.read_bytes() if isinstance(table, Path) else table
    return list(csv.DictReader(data.decode().splitlines()))


def manifest_of(release: Path) -> dict:
    return json.loads((release / "manifest.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def twins(tmp_path_factory: pytest.TempPathFactory) -> tuple[Ended, Ended]:
    """Two refreshes of one contest at once, same seed: one prints for people, one for a script."""
    folder = contest_folder(tmp_path_factory.mktemp("twins"))
    pair = start_refresh(folder, "--seed", 7), start_refresh(folder, "--seed", 7, "--json")
    shown, scripted = (ended(process, folder) for process in pair)
    return shown, scripted


@pytest.fixture(scope="module")
def looks(tmp_path_factory: pytest.TempPathFactory) -> tuple[Ended, Ended]:
    """A refresh with too few draws, and a look back into a folder of its own; at the same time."""
    today, past = (contest_folder(tmp_path_factory.mktemp(name)) for name in ("today", "past"))
    pair = (
        start_refresh(today, "--draws", TOO_FEW_DRAWS, "--json"),
        start_refresh(past, "--draws", TOO_FEW_DRAWS, "--as-of", LOOK_BACK, "--out", past / "look back"),
    )
    short, look_back = (ended(p, folder) for p, folder in zip(pair, (today, past), strict=True))
    return short, look_back


def forked_by(process: int) -> set[int]:
    """Processes that run the same program: those that draw."""
    family, own = set(), command_of(process)
    for thread in Path(f"/proc/{process}/task").glob("*/children"):
        family |= {child for child in map(int, thread.read_text().split()) if command_of(child) == own}
    return family


def command_of(process: int) -> bytes:
    try:
        return Path(f"/proc/{process}/cmdline").read_bytes()
    except OSError:
        return b""


def wait_until_it_draws(process: subprocess.Popen[str]) -> set[int]:
    """Wait until the same processes were seen at work twice."""
    before: set[int] = set()
    give_up = monotonic() + LONGEST_SECONDS
    while process.poll() is None and monotonic() < give_up:
        now = forked_by(process.pid)
        if now and now == before:
            return now
        before = now
        sleep(0.5)
    raise RuntimeError(f"the refresh never came to draw: {process.communicate()[1]}")


def still_running(processes: set[int]) -> set[int]:
    def runs(process: int) -> bool:
        # One that has ended stays in the list without a command until its parent, or init, has asked for it.
        return command_of(process) != b""

    give_up = monotonic() + 60
    while (left := {p for p in processes if runs(p)}) and monotonic() < give_up:
        sleep(0.2)
    return left


@dataclass(frozen=True)
class Stopped:
    """A refresh that was ended from outside while it drew."""

    run: Ended
    files_before: set[str]
    left_running: set[int]


@pytest.fixture(scope="module")
def stopped(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Stopped]:
    """One refresh interrupted, one killed, both in the middle of drawing."""
    if not Path("/proc/self/task").is_dir():
        pytest.skip("the system does not show which processes belong together")
    folders = {how: contest_folder(tmp_path_factory.mktemp(how)) for how in ("interrupted", "killed")}
    before = {how: files_in(folder) for how, folder in folders.items()}
    runs = {how: start_refresh(folder, "--draws", ENDLESS_DRAWS) for how, folder in folders.items()}
    try:
        drawing = {how: wait_until_it_draws(process) for how, process in runs.items()}
        os.killpg(runs["interrupted"].pid, signal.SIGINT)
        runs["killed"].kill()
        left = {how: still_running({runs[how].pid, *drawing[how]}) for how in runs}
    finally:
        for process in runs.values():
            # Nobody is left of a group that is gone.
            with suppress(ProcessLookupError):
                os.killpg(process.pid, signal.SIGKILL)
    done = {how: ended(process, folders[how]) for how, process in runs.items()}
    return {how: Stopped(done[how], before[how], left[how]) for how in runs}


def files_in(folder: Path) -> set[str]:
    return {path.relative_to(folder).as_posix() for path in folder.rglob("*")}


def test_a_refresh_leaves_a_release_with_a_public_and_a_desk_half(twins: tuple[Ended, Ended]) -> None:
    shown, _ = twins
    assert shown.code == 0, shown.err
    for release in shown.releases:
        assert sorted(p.name for p in release.iterdir()) == ["desk", "manifest.json", "public"]
        assert manifest_of(release)["checks"]["passed"]
        assert {"public/support.csv", "public/seats.csv", "desk/polls_weighed.csv"} <= set(tables_of(release))
    assert not list(shown.folder.glob(".*"))


def test_two_refreshes_at_once_both_arrive_under_names_of_their_own(twins: tuple[Ended, Ended]) -> None:
    shown, scripted = twins
    assert (shown.code, scripted.code) == (0, 0), shown.err + scripted.err
    day = manifest_of(shown.releases[0])["run_date"]
    assert [release.name for release in shown.releases] == [day, f"{day}-02"]


def test_the_same_inputs_and_seed_give_the_same_bytes(twins: tuple[Ended, Ended]) -> None:
    one, other = (tables_of(release) for release in twins[0].releases)
    assert len(one) == len(ALL_SCHEMAS)
    assert one == other


def test_json_alone_owns_standard_output_and_the_bar_keeps_off_it(twins: tuple[Ended, Ended]) -> None:
    shown, scripted = twins
    record = json.loads(scripted.out)
    assert record["passed"] is True
    assert Path(record["release"]) in scripted.releases
    assert scripted.err == ""
    assert shown.out.splitlines()[-1].endswith("index.html")
    assert "drawing" not in shown.out


def test_too_few_draws_land_under_failed_and_leave_with_3(looks: tuple[Ended, Ended]) -> None:
    short, _ = looks
    assert short.code == 3, short.err
    (release,) = short.releases
    assert release.parent.name == "failed"
    assert json.loads(short.out)["passed"] is False


def test_every_table_and_page_of_a_failed_release_says_so(looks: tuple[Ended, Ended]) -> None:
    (release,) = looks[0].releases
    tables = tables_of(release)
    assert len(tables) == len(ALL_SCHEMAS)
    for name, table in tables.items():
        assert all("CHECKS FAILED" in row["caution"] for row in rows_of(table)), name
    for page in ("index.html", "method.md"):
        assert "CHECKS FAILED" in (release / "public" / page).read_text(encoding="utf-8").upper(), page


def test_a_look_back_sees_only_what_was_published_then(looks: tuple[Ended, Ended]) -> None:
    _, look_back = looks
    release = look_back.folder / "look back"
    register = rows_of(look_back.folder / "polls.csv")
    then, day = manifest_of(release), LOOK_BACK.isoformat()
    known = {row["poll"] for row in register if row["published"] <= day}
    assert any(row["published"] == day for row in register)
    assert any(row["end"] <= day < row["published"] for row in register)
    assert then["run_date"] == day
    assert {row["poll"] for row in rows_of(release / "public" / "polls_used.csv")} == known
    assert max(row["date"] for row in rows_of(release / "public" / "support.csv")) <= then["polling_day"]


def test_a_look_back_is_no_release_of_the_week(looks: tuple[Ended, Ended]) -> None:
    assert looks[1].releases == []


def test_an_interrupted_refresh_says_so_and_leaves_nothing(stopped: dict[str, Stopped]) -> None:
    interrupted = stopped["interrupted"]
    assert interrupted.run.code == 130
    assert "interrupted; nothing was written" in interrupted.run.err
    assert files_in(interrupted.run.folder) == interrupted.files_before


def test_a_killed_refresh_leaves_nothing(stopped: dict[str, Stopped]) -> None:
    killed = stopped["killed"]
    assert killed.run.code == -signal.SIGKILL
    assert files_in(killed.run.folder) == killed.files_before


@pytest.mark.parametrize("how", ["interrupted", "killed"])
def test_no_process_goes_on_drawing_for_a_refresh_that_is_gone(how: str, stopped: dict[str, Stopped]) -> None:
    assert stopped[how].left_running == set()


def test_a_wrong_cell_is_named_by_file_row_and_column_and_nothing_is_written(tmp_path: Path) -> None:
    folder = contest_folder(tmp_path / "contest")
    register = folder / "polls.csv"
    first = rows_of(register)[0]
    text = register.read_text(encoding="utf-8")
    register.write_text(text.replace(f",{first['sample']},", ",many,", 1), encoding="utf-8")
    before = files_in(folder)
    refused = ended(start_refresh(folder), folder)
    assert refused.code == 1
    assert refused.out == ""
    for part in ("polls.csv", "row 2, column sample", '"many"', "Nothing was written."):
        assert part in refused.err
    assert files_in(folder) == before
