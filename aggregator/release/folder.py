"""One release, one folder: whole, or not there at all.

A release is built in a hidden folder beside ``releases/`` and then renamed. Renaming a folder onto one that
holds files fails on every system, so the rename is at the same time the claim of the name: of two runs that
end together one gets ``2031-04-02``, the other ``2031-04-02-02``, and no reader ever sees half a release.
"""

from __future__ import annotations

import errno
import os
import secrets
import shutil
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from datetime import date
from itertools import count
from pathlib import Path

from aggregator.errors import MachineError, UsageError

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
        If ``out`` is a file, or a folder with anything in it.
    """
    if out.is_symlink() or (out.exists() and (not out.is_dir() or any(out.iterdir()))):
        raise UsageError(
            f"{out} already holds something; name a folder that does not exist yet, or an empty one"
        )


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
        shelf = out.parent
    else:
        shelf = contest_folder / RELEASES / FAILED if not passed else contest_folder / RELEASES
    beside = out.parent if out is not None else contest_folder
    with _writing_to(shelf):
        shelf.mkdir(parents=True, exist_ok=True)
        with _unfinished_folder(beside) as unfinished:
            fill(unfinished)
            if out is None:
                return _claim_name(unfinished, shelf, run_date)
            return _claim_place(unfinished, out)


@contextmanager
def _unfinished_folder(beside: Path) -> Iterator[Path]:
    """Make a new hidden folder, gone again unless it was renamed."""
    folder = beside / f"{UNFINISHED}{secrets.token_hex(6)}"
    folder.mkdir()
    try:
        yield folder
    finally:
        # Also on Ctrl-C. After a rename there is nothing here any more.
        shutil.rmtree(folder, ignore_errors=True)


def _claim_name(unfinished: Path, shelf: Path, run_date: date) -> Path:
    for number in count(1):
        suffix = "" if number == 1 else f"-{number:02d}"
        place = shelf / f"{run_date.isoformat()}{suffix}"
        try:
            os.rename(unfinished, place)
        except OSError as problem:
            if problem.errno not in _NAME_TAKEN:
                raise
        else:
            return place
    raise AssertionError("unreachable: the count of names has no end")


def _claim_place(unfinished: Path, out: Path) -> Path:
    try:
        os.rename(unfinished, out)
    except OSError as problem:
        if problem.errno in _NAME_TAKEN:
            raise UsageError(
                f"{out} was filled by someone else while this release was being made"
            ) from problem
        raise
    return out


@contextmanager
def _writing_to(place: Path) -> Iterator[None]:
    try:
        yield
    except OSError as problem:
        what = (
            "the disk is full. Free some space"
            if problem.errno in _DISK_FULL
            else f"{problem.strerror or problem}. Check that the folder exists and may be written"
        )
        raise MachineError(
            f"The release could not be written to {place}: {what}, then run again. Nothing was left behind."
        ) from problem
