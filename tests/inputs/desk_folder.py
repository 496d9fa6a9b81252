"""A small sound contest to be spoilt by the tests, one place at a time."""

from __future__ import annotations

import csv
import io
from datetime import date
from pathlib import Path

import openpyxl

from aggregator.errors import InputError
from aggregator.inputs.contest_folder import read_contest_folder
from aggregator.inputs.desk_inputs import DeskInputs
from aggregator.problems import Problem

# Between the last fieldwork and polling day of the contest below.
TODAY = date(2031, 4, 30)

CONTEST = """\
title = "Assembly of the Lake Provinces 2031"
polling_day = 2031-05-18

[[party]]
code = "HU"
name = "Harbour Union"

[[party]]
code = "UP"
name = "Upland Party"
inherits = { RF = 0.8 }

[[party]]
code = "OL"
name = "Orchard League"
regions = ["MERE"]

[[alliance]]
code = "LAKE"
name = "Lake Alliance"
members = ["HU", "OL"]
from = 2031-01-15

[[region]]
code = "NORTH"
name = "Northern Shore"

[[region]]
code = "MERE"
name = "Upper Mere"

[last_result]
date = 2027-05-16
file = "result_last.csv"

[counting]
rule = "plurality"

[[release.silence]]
from = 2031-05-16
until = 2031-05-18
time_zone = "Europe/Zurich"
"""

POLLS = """\
poll,house,sponsor,start,end,published,question,region,sample,effective,mode,population,method,HU,UP,OL,LAKE,OTH,undecided,status,status_date,replaces,use,why_not,source,note
T-1,Tarrow Research,Lake Courier,2031-02-03,2031-02-05,2031-02-07,,,1012,,phone,voters,,34,33,16,,7,10,,,,,,,
K-1,Kestrel Poll,,2031-02-20,2031-02-23,2031-02-25,,,1540,1210,online,voters,,38.4,38.1,17.9,,5.6,,,,,,,,
M-1,Mellow Panel,,2031-03-10,2031-03-13,2031-03-15,,NORTH,910,,online,adults,,50,42,,,8,,,,,,,,
M-1,Mellow Panel,,2031-03-10,2031-03-13,2031-03-15,,MERE,1090,,online,adults,,27,36,31,,6,,,,,,,,
K-2,Kestrel Poll,,2031-04-20,2031-04-23,2031-04-25,,,1495,,online,voters,,,39.6,,55.5,4.9,,,,,,,,
"""

RESULT = """\
seat,name,region,HU,UP,OL,RF,OTH
N1,Northgate,NORTH,9120,6310,,1000,880
N2,Pier Head,NORTH,10480,4620,,900,760
M1,Mereside,MERE,6120,6450,5260,1000,730
M2,Old Orchard,MERE,4890,5310,8120,1100,640
M3,Stonebridge,MERE,5570,8240,3980,950,880
"""

FILES = {"contest.toml": CONTEST, "polls.csv": POLLS, "result_last.csv": RESULT}


def spoilt(name: str, *changes: tuple[str, str]) -> str:
    """One of the sound files with some of its text exchanged; each text must be there."""
    text = FILES[name]
    for old, new in changes:
        if old not in text:
            raise ValueError(f"{old!r} is not in {name}")
        text = text.replace(old, new, 1)
    return text


def write_folder(folder: Path, **files: str | bytes | None) -> Path:
    """Write the sound contest, some files exchanged (``polls_csv=…``) or left out (None)."""
    wanted: dict[str, str | bytes | None] = dict(FILES)
    wanted |= {name if "." in name else ".".join(name.rsplit("_", 1)): text for name, text in files.items()}
    folder.mkdir(exist_ok=True)
    for name, content in wanted.items():
        if isinstance(content, str):
            content = content.encode()
        if content is not None:
            (folder / name).write_bytes(content)
    return folder


def read(folder: Path, *, as_of: date | None = None, today: date = TODAY) -> DeskInputs:
    return read_contest_folder(folder, as_of=as_of, today=today)


def findings(folder: Path, *, as_of: date | None = None, today: date = TODAY) -> tuple[Problem, ...]:
    """All errors and warnings of a folder."""
    try:
        return read(folder, as_of=as_of, today=today).warnings
    except InputError as error:
        return error.problems


def workbook(rows: list[list[object]], *, sheet: str = "polls", others: tuple[str, ...] = ()) -> bytes:
    """An XLSX workbook with one table, and further blank sheets."""
    book = openpyxl.Workbook()
    table = book.active
    table.title = sheet
    for row in rows:
        table.append(row)
    for name in others:
        book.create_sheet(name)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def as_rows(text: str) -> list[list[object]]:
    """A CSV text as cells, blank ones None."""
    return [[cell or None for cell in row] for row in csv.reader(io.StringIO(text))]
