"""The files of a contest folder as bytes, each read once and remembered."""

from __future__ import annotations

from pathlib import Path

from aggregator.errors import MachineError
from aggregator.inputs.close_spelling import close_spelling
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem


def read_bytes(folder: Path, name: str, *, read: dict[str, bytes]) -> bytes | None:
    """Read the bytes of a file, None where it is not there.

    Parameters
    ----------
    read
        Bytes by name of the files read so far; takes up this one.

    Raises
    ------
    MachineError
        If the file is there and the machine cannot read it.
    """
    path = folder / name
    try:
        data = path.read_bytes()
    except FileNotFoundError:
        return None
    except OSError as error:
        raise MachineError(f"{path} cannot be read: {error.strerror or error}.") from error
    read[name] = data
    return data


def read_text_or_workbook(
    folder: Path, stem: str, *, what: str, read: dict[str, bytes]
) -> tuple[tuple[str, bytes] | None, list[Problem]]:
    """Read the one of ``stem.csv`` and ``stem.xlsx`` that is there; both at once are a finding.

    Parameters
    ----------
    what
        What the file holds, for the finding.

    Returns
    -------
    Name and bytes, None where there is no file or one too many, and what was found.
    """
    names = (f"{stem}.csv", f"{stem}.xlsx")
    there = {name: data for name in names if (data := read_bytes(folder, name, read=read)) is not None}
    if len(there) > 1:
        found = Problem(
            names[1], None, None, f"a second {what} beside {names[0]}", f"one {what}",
            "Move one of the two out of the folder.", Rule.FILE_THERE,
        )  # fmt: skip
        return None, [found]
    return next(iter(there.items()), None), []


def missing_file(folder: Path, name: str, *, needed: str, read: dict[str, bytes]) -> Problem:
    """Make the finding that a file is not there; names one spelt nearly like it that nobody else reads."""
    near = close_spelling(name, (p.name for p in folder.iterdir() if p.is_file() and p.name not in read))
    remedy = f'If "{near}" is meant, save it as {name}; else add the file.' if near else "Add the file."
    return Problem(name, None, None, "no such file", needed, remedy, Rule.FILE_THERE)
