"""One release, one folder: whole, or not there at all.

A release is built in a hidden folder beside ``releases/`` and then renamed. Renaming a folder onto one that
holds files fails, so the rename is at the same time the claim of the name: of two runs that end together
one gets ``2031-04-02``, the other ``2031-04-02-02``, and no reader ever sees half a release.

Whoever builds holds a lock on the hidden folder. The system drops the lock of a process that was killed, so
the next run knows what was abandoned, and sweeps it away.
"""

from __future__ import annotations

import errno
import os
import secrets
import shutil
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from datetime import date
from itertools import count
from pathlib import Path

from aggregator.errors import MachineError, UsageError

try:
    import fcntl
except ImportError:  # Windows: nothing is swept away there.
    fcntl = None  # type: ignore[assignment]

RELEASES = "releases"
FAILED = "failed"
UNFINISHED = ".fieldfold-"
"""How the name of an unfinished release begins."""

_NAME_TAKEN = {errno.ENOTEMPTY, errno.EEXIST, errno.ENOTDIR, errno.EISDIR}
_DISK_FULL = {errno.ENOSPC, errno.EDQUOT, errno.EFBIG}


def check_place_is_free(out: Path) -> None:
    """Refuse a place for a release that already holds something.

    Raises
    ------
    UsageError
        If ``out`` is a file or a link, or a folder with anything in it.
    """
    if out.is_symlink() or (out.exists() and (not out.is_dir() or any(out.iterdir()))):
        raise UsageError(
            f"{out} already holds something; name a folder that does not exist yet, or an empty one"
        )


def shelf_of(contest_folder: Path, *, passed: bool) -> Path:
    """Name the folder that holds a contest's releases: of fits that passed their checks, or of others."""
    return contest_folder / RELEASES if passed else contest_folder / RELEASES / FAILED


def write_folder(
    fill: Callable[[Path], None], *, contest_folder: Path, run_date: date, passed: bool, out: Path | None
) -> Path:
    """Build a release and put it in its place.

    Parameters
    ----------
    fill
        Writes the release's files into the empty folder it is given.
    contest_folder
        Holds ``releases/``.
    run_date
        Names the release.
    passed
        Whether the checks passed; else it goes to ``releases/failed/``.
    out
        A place of the caller's choice instead.

    Returns
    -------
    pathlib.Path
        Where the release is.

    Raises
    ------
    UsageError
        If ``out`` already holds something.
    MachineError
        If the disk is full or the place cannot be written. Nothing is left behind, then or when ``fill``
        fails or is interrupted.
    """
    if out is not None:
        check_place_is_free(out)
        shelf = beside = out.absolute().parent
    else:
        beside = contest_folder
        shelf = shelf_of(contest_folder, passed=passed)
    with _writing_to(shelf):
        shelf.mkdir(parents=True, exist_ok=True)
        _sweep_abandoned(beside)
        with _unfinished_folder(beside) as unfinished:
            fill(unfinished)
            return _claim_name(unfinished, shelf, run_date) if out is None else _claim_place(unfinished, out)


def replace_folder(fill: Callable[[Path], None], *, place: Path, what: str) -> Path:
    """Build a folder and put it in a place of its own, over an earlier one of the same kind.

    Parameters
    ----------
    fill
        Writes the files into the empty folder it is given.
    place
        Where the folder goes. What it holds now is gone afterwards: the caller has made sure that it may.
    what
        What is written, for the error.

    Raises
    ------
    MachineError
        If the disk is full or the place cannot be written. The earlier folder is then as it was.
    """
    shelf = place.absolute().parent
    with _writing_to(place, what=what):
        shelf.mkdir(parents=True, exist_ok=True)
        _sweep_abandoned(shelf)
        with _unfinished_folder(shelf) as unfinished, _unfinished_folder(shelf) as aside:
            fill(unfinished)
            earlier = aside / place.name
            try:
                if place.exists():
                    os.rename(place, earlier)
                os.rename(unfinished, place)
            except BaseException:  # Also on Ctrl-C: the earlier one must not go with the folder aside.
                if earlier.exists():
                    os.rename(earlier, place)
                raise
    return place


@contextmanager
def _unfinished_folder(beside: Path) -> Iterator[Path]:
    """Make a new hidden folder, locked while in use, and gone again unless it was renamed."""
    folder, lock = _make_locked(beside)
    try:
        yield folder
    finally:
        # Also on Ctrl-C. After a rename there is nothing here any more.
        shutil.rmtree(folder, ignore_errors=True)
        if lock is not None:
            os.close(lock)


def _make_locked(beside: Path) -> tuple[Path, int | None]:
    """Make a folder and lock it; again under another name if a sweep got hold of it in between."""
    while True:
        folder = beside / f"{UNFINISHED}{secrets.token_hex(6)}"
        folder.mkdir()
        lock = _lock(folder)
        if fcntl is None or (lock is not None and folder.exists()):
            return folder, lock
        if lock is not None:
            os.close(lock)


def _sweep_abandoned(beside: Path) -> None:
    """Remove unfinished releases that no living process holds."""
    for folder in beside.glob(f"{UNFINISHED}*"):
        with suppress(OSError):
            lock = _lock(folder)
            if lock is not None:
                shutil.rmtree(folder, ignore_errors=True)
                os.close(lock)


def _lock(folder: Path) -> int | None:
    """Lock a folder for this process; None if another holds it, or where locks do not exist."""
    if fcntl is None:
        return None
    try:
        handle = os.open(folder, os.O_RDONLY)
    except FileNotFoundError:
        return None
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        os.close(handle)
        return None
    return handle


def _claim_name(unfinished: Path, shelf: Path, run_date: date) -> Path:
    for number in count(1):
        place = shelf / (run_date.isoformat() if number == 1 else f"{run_date.isoformat()}-{number:02d}")
        if _rename(unfinished, place):
            return place
    raise AssertionError("unreachable: there is always another number")


def _claim_place(unfinished: Path, out: Path) -> Path:
    if not _rename(unfinished, out):
        raise UsageError(f"{out} was filled by someone else while this release was being made")
    return out


def _rename(unfinished: Path, place: Path) -> bool:
    """Rename a folder; False if the name is taken."""
    try:
        os.rename(unfinished, place)
    except OSError as problem:
        if problem.errno in _NAME_TAKEN:
            return False
        raise
    return True


@contextmanager
def _writing_to(place: Path, *, what: str = "release") -> Iterator[None]:
    try:
        yield
    except OSError as problem:
        cause = (
            "the disk is full. Free some space"
            if problem.errno in _DISK_FULL
            else f"{problem.strerror or problem}. Check that the folder exists and may be written"
        )
        raise MachineError(
            f"The {what} could not be written to {place}: {cause}, then run again. Nothing was left behind."
        ) from problem
