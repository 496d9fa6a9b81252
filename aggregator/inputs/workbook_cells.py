"""The cells of one sheet of an XLSX workbook, true numbers and dates kept as such."""

from __future__ import annotations

import io
import zipfile
from datetime import date, datetime
from xml.etree import ElementTree

import python_calamine

from aggregator.inputs.reading_rules import Rule
from aggregator.inputs.sheet_table import Cell
from aggregator.problems import Problem

_MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
_LINK = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"
_PACKAGE = "{http://schemas.openxmlformats.org/package/2006/relationships}"


def read_workbook_cells(
    data: bytes, *, file: str, sheet: str
) -> tuple[list[list[Cell]] | None, list[Problem]]:
    """Read all cells of the only sheet, or of the one called ``sheet``, blank ones as ``""``."""
    try:
        workbook = python_calamine.CalamineWorkbook.from_object(io.BytesIO(data))
    except (python_calamine.CalamineError, zipfile.BadZipFile) as error:
        return None, [
            Problem(
                file, None, None, f"a file that is no workbook ({error})", "an XLSX workbook",
                "Save it again as XLSX, without a password.", Rule.FILE_READABLE,
            )
        ]  # fmt: skip
    names = workbook.sheet_names
    if len(names) > 1 and sheet not in names:
        return None, [
            Problem(
                file, None, None, f"{len(names)} sheets ({', '.join(names)})",
                f'one sheet, or one called "{sheet}"', f'Name the sheet to read "{sheet}".',
                Rule.WORKBOOK_SHAPE,
            )
        ]  # fmt: skip
    name = sheet if sheet in names else names[0]
    found = workbook.get_sheet_by_name(name)
    problems = [
        Problem(
            file, first[0] + 1, None, f"merged cells (rows {first[0] + 1} to {last[0] + 1})",
            "single cells", "Unmerge them and fill in each.", Rule.WORKBOOK_SHAPE,
        )
        for first, last in (found.merged_cell_ranges or [])
    ]  # fmt: skip
    problems += _check_lost_values(data, file=file, sheet=name)
    cells = [[_plain(c) for c in row] for row in found.to_python(skip_empty_area=False)]
    return cells, problems


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


def _check_lost_values(data: bytes, *, file: str, sheet: str) -> list[Problem]:
    """Report cells that look blank only because the workbook holds an error or no computed value."""
    problems = []
    with zipfile.ZipFile(io.BytesIO(data)) as archive, archive.open(_sheet_part(archive, sheet)) as part:
        for _, element in ElementTree.iterparse(part):
            if element.tag != _MAIN + "c":
                continue
            value, kind = element.findtext(_MAIN + "v"), element.get("t")
            if kind == "e":
                found = f"the error {value}"
            # A formula may well come to an empty text (t="str"); no value at all was never computed.
            elif element.find(_MAIN + "f") is not None and not value and kind != "str":
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


def _sheet_part(archive: zipfile.ZipFile, sheet: str) -> str:
    book = ElementTree.fromstring(archive.read("xl/workbook.xml"))
    links = ElementTree.fromstring(archive.read("xl/_rels/workbook.xml.rels"))
    wanted = next(s.get(_LINK) for s in book.iter(_MAIN + "sheet") if s.get("name") == sheet)
    target = next(r.get("Target", "") for r in links.iter(_PACKAGE + "Relationship") if r.get("Id") == wanted)
    return target.removeprefix("/") if target.startswith("/") else f"xl/{target}"
