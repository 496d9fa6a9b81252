"""A new contest folder: commented, invented, and complete enough to be refreshed as it is."""

from __future__ import annotations

import re
import shutil
import tempfile
from datetime import date, timedelta
from importlib.resources import files
from pathlib import Path
from string import Template

from aggregator.errors import MachineError, UsageError

TEMPLATE_FILES = ("contest.toml", "polls.csv", "result_last.csv")

_SUNDAY = 6


def new_contest(folder: Path, *, today: date) -> tuple[Path, ...]:
    """Write a new contest folder, whole or not at all.

    Its polls lie in the last ten weeks, its polling day is a Sunday eight weeks ahead, so that it can be
    checked and refreshed at once.

    Parameters
    ----------
    folder
        A folder that does not exist yet, or is empty.
    today
        The calendar's day.

    Returns
    -------
    The files that were written.

    Raises
    ------
    UsageError
        If something is in the way.
    MachineError
        If the machine cannot write there.
    """
    folder = folder.absolute()
    if folder.is_dir():
        if any(folder.iterdir()):
            raise UsageError(f"{folder} is not empty: name a folder that does not exist yet.")
    elif folder.exists() or folder.is_symlink():
        raise UsageError(f"{folder} is a file: name a folder that does not exist yet.")
    texts = {name: _filled_in(name, today=today) for name in TEMPLATE_FILES}
    try:
        folder.parent.mkdir(parents=True, exist_ok=True)
        # Beside its place, so that the last step is a rename within one disk.
        draft = Path(tempfile.mkdtemp(prefix=f".{folder.name}-", dir=folder.parent))
        try:
            for name, text in texts.items():
                (draft / name).write_text(text, encoding="utf-8", newline="\n")
            if folder.exists():
                for name in TEMPLATE_FILES:
                    (draft / name).replace(folder / name)
            else:
                draft.chmod(0o755)
                draft.replace(folder)
        finally:
            shutil.rmtree(draft, ignore_errors=True)
    except OSError as error:
        raise MachineError(f"{folder} cannot be written: {error.strerror or error}.") from error
    return tuple(folder / name for name in TEMPLATE_FILES)


def _filled_in(name: str, *, today: date) -> str:
    text = files("aggregator.inputs").joinpath("templates", name).read_text(encoding="utf-8")
    polling_day = today + timedelta(weeks=8, days=(_SUNDAY - today.weekday()) % 7)
    days = {
        "polling_day": polling_day,
        "silence_day": polling_day - timedelta(days=7),
        "alliance_day": today - timedelta(weeks=30),
        "jolt_day": today - timedelta(days=30),
        "last_election": polling_day - timedelta(weeks=4 * 52),
    }
    days |= {f"d{n}": today - timedelta(days=int(n)) for n in re.findall(r"\$d([0-9]+)", text)}
    return Template(text).substitute({key: day.isoformat() for key, day in days.items()})
