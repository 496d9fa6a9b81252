"""The cells of one sheet of an XLSX workbook, true numbers and dates kept as such."""

from __future__ import annotations

import io
import zipfile
import zlib
from datetime import date, datetime
from xml.etree import ElementTree

import python_calamine

from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.sheet_table import Cell
from aggregator.problems import Problem

# Parts of a workbook; "{*}" because transitional and strict files have different namespaces.
_BOOK, _LINKS = "xl/workbook.xml", "xl/_rels/workbook.xml.rels"


# What a damaged, locked or foreign file makes the libraries raise.
_NO_WORKBOOK = (
    python_calamine.CalamineError, zipfile.BadZipFile, zlib.error, ElementTree.ParseError, LookupError,
    NotImplementedError, RuntimeError, EOFError, ValueError,
)  # fmt: skip


def read_workbook_cells(
    data: bytes, *, file: str, sheet: str
) -> tuple[list[list[Cell]] | None, list[Problem]]:
    """Read all cells of the only sheet, or of the one called ``sheet``, blank ones as ``""``."""
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            parts = _sheet_parts(archive)
            name = sheet if sheet in parts else next(iter(parts))
            if len(parts) > 1 and name != sheet:
                return None, [_which_sheet(list(parts), file=file, sheet=sheet)]
            lost = _check_lost_values(archive, file=file, part=parts[name])
        table = python_calamine.CalamineWorkbook.from_object(io.BytesIO(data)).get_sheet_by_name(name)
        cells = [[_plain(c) for c in row] for row in table.to_python(skip_empty_area=False)]
    except _NO_WORKBOOK:
        return None, [
            Problem(
                file, None, None, "a file that is no XLSX workbook, or a damaged one", "an XLSX workbook",
                "Save it again as XLSX, without a password.", Rule.FILE_READABLE,
            )
        ]  # fmt: skip
    merged = [
        Problem(
            file, first[0] + 1, None, f"merged cells (rows {first[0] + 1} to {last[0] + 1})",
            "single cells", "Unmerge them and fill in each.", Rule.WORKBOOK_SHAPE,
        )
        for first, last in (table.merged_cell_ranges or [])
    ]  # fmt: skip
    return cells, merged + lost


def _which_sheet(names: list[str], *, file: str, sheet: str) -> Problem:
    return Problem(
        file, None, None, f"{len(names)} sheets ({', '.join(names)})",
        f'one sheet, or one called "{sheet}"', f'Name the sheet to read "{sheet}".', Rule.WORKBOOK_SHAPE,
    )  # fmt: skip


def _plain(value: object) -> Cell:
    if isinstance(value, bool):
        return value
    if isinstance(value, (int, float)):
        return float(value)
    if isinstance(value, datetime):
        at_midnight = value.hour == value.minute == value.second == value.microsecond == 0
        return value.date() if at_midnight else value.isoformat(sep=" ")
    if isinstance(value, date):
        return value
    return str(value).strip()


def _check_lost_values(archive: zipfile.ZipFile, *, file: str, part: str) -> list[Problem]:
    """Report cells that look blank only because the workbook holds an error or no computed value."""
    problems = []
    with archive.open(part) as stream:
        for _, element in ElementTree.iterparse(stream):
            if not element.tag.endswith("}c"):
                continue
            value, kind = element.findtext("{*}v"), element.get("t")
            if kind == "e":
                found = f"the error {value}"
            # A formula may well come to an empty text (t="str"); no value at all was never computed.
            elif element.find("{*}f") is not None and not value and kind != "str":
                found = "a formula without a computed value"
            else:
                continue
            place = element.get("r", "")
            problems.append(
                Problem(
                    file, int("".join(c for c in place if c.isdigit())), None, f"{found} in cell {place}",
                    "a value", "Type the value, or open and save the workbook in a spreadsheet program.",
                    Rule.WORKBOOK_SHAPE,
                )
            )  # fmt: skip
    return problems


def _sheet_parts(archive: zipfile.ZipFile) -> dict[str, str]:
    """Name the archive's part of each sheet, by the sheet's name."""
    links = ElementTree.fromstring(archive.read(_LINKS))
    targets = {link.attrib["Id"]: link.attrib["Target"] for link in links}
    parts = {}
    for sheet in ElementTree.fromstring(archive.read(_BOOK)).iterfind("{*}sheets/{*}sheet"):
        target = next(targets[v] for k, v in sheet.attrib.items() if k.endswith("}id"))
        parts[sheet.attrib["name"]] = target[1:] if target.startswith("/") else f"xl/{target}"
    return parts
