"""``contest.toml`` into a :class:`Contest`; what does not fit becomes findings with key paths."""

from __future__ import annotations

import re
import tomllib
from datetime import date
from typing import Any, get_args

from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo

from aggregator.inputs.close_spelling import close_spelling, did_you_mean
from aggregator.inputs.contest import FIRST_DAY, LAST_DAY, Contest
from aggregator.inputs.reading_rules import Rule
from aggregator.problems import Problem

CONTEST_FILE = "contest.toml"

# Where a key of a broken contest is missing, the other files are still checked against this stand-in.
_STAND_IN: dict[str, Any] = {
    "title": "?",
    "polling_day": LAST_DAY,
    "name": "?",
    "members": [],
    "date": FIRST_DAY,
    "from": LAST_DAY,
    "until": LAST_DAY,
}


def read_contest(data: bytes) -> tuple[Contest | None, list[Problem]]:
    """Read a contest from the bytes of its file.

    Returns
    -------
    The contest and what was found wrong. Where something is wrong, the contest is a rough one, whose
    codes can be used to check the other files and nothing else; None where not even that is possible.
    """
    try:
        raw = tomllib.loads(data.decode("utf-8-sig"))
    except UnicodeDecodeError:
        remedy = "Save the file again as UTF-8."
        found = "bytes that are not UTF-8"
        return None, [Problem(CONTEST_FILE, None, None, found, "text in UTF-8", remedy, Rule.FILE_READABLE)]
    except tomllib.TOMLDecodeError as error:
        return None, [_not_toml(str(error))]
    try:
        return Contest.model_validate(raw), []
    except ValidationError as error:
        details = error.errors()
    return _rough_contest(raw, details), _as_problems(details)


def _not_toml(message: str) -> Problem:
    match = re.search(r" \(at line (\d+), column \d+\)$", message)
    row = int(match[1]) if match else None
    text = message[: match.start()] if match else message
    return Problem(
        CONTEST_FILE, row, None, f"text that is not TOML ({text})", "TOML",
        "Mend this line: text stands in quotation marks, dates do not.", Rule.FILE_READABLE,
    )  # fmt: skip


def key_path(location: tuple[str | int, ...]) -> str:
    """Write a place in the file as a reader counts it: ``party[2].code`` is the second party's code."""
    path = ""
    for part in location:
        path += f"[{part + 1}]" if isinstance(part, int) else f".{part}" if path else part
    return path


def _model_in(annotation: Any) -> type[BaseModel] | None:
    """Find the model class inside an annotation such as ``tuple[Party, ...]`` or ``LastResult | None``."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next((m for a in get_args(annotation) if (m := _model_in(a)) is not None), None)


def known_keys(model: type[BaseModel]) -> dict[str, FieldInfo]:
    """List the keys of one table of the file, as written there, with what each holds."""
    return {field.alias or name: field for name, field in model.model_fields.items()}


def _field_at(location: tuple[str | int, ...]) -> tuple[type[BaseModel], FieldInfo | None]:
    """Find the table a place lies in, and its field there (None for a key no one knows)."""
    table: type[BaseModel] = Contest
    field: FieldInfo | None = None
    for i, part in enumerate(location):
        if isinstance(part, int):
            continue
        field = known_keys(table).get(part)
        inner = _model_in(field.annotation) if field is not None else None
        if inner is None or i == len(location) - 1:
            return table, field
        table = inner
    return table, field


def _as_problems(details: list[Any]) -> list[Problem]:
    """Make findings; a needed key that stands there misspelt is one finding, not two."""
    misspelt = {
        (*d["loc"][:-1], close_spelling(str(d["loc"][-1]), known_keys(_field_at(d["loc"])[0])))
        for d in details
        if d["type"] == "extra_forbidden"
    }
    return [_as_problem(d) for d in details if d["type"] != "missing" or tuple(d["loc"]) not in misspelt]


def _as_problem(detail: Any) -> Problem:
    location = tuple(detail["loc"])
    table, field = _field_at(location)
    path, key = key_path(location), str(location[-1])
    if detail["type"] == "extra_forbidden":
        remedy = did_you_mean(key, known_keys(table))
        return Problem(
            CONTEST_FILE, None, path, "a key of this name", "a known key", remedy, Rule.KEY_UNKNOWN
        )
    expected = field.description if field is not None and field.description else "a value of another kind"
    if detail["type"] == "missing":
        remedy = "Add the key." if len(location) == 1 else "Add the key to this table."
        return Problem(CONTEST_FILE, None, path, "no such key", expected, remedy, Rule.KEY_NEEDED)
    return Problem(
        CONTEST_FILE, None, path, _shown(detail["input"]), expected, "Change the value.", Rule.KEY_VALUE
    )


def _shown(value: Any) -> str:
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, dict):
        return "a table"
    return "an empty list" if value == [] else repr(value)


def _rough_contest(raw: dict[str, Any], details: list[Any]) -> Contest | None:
    """Build the contest without what is wrong in it, for checking codes in the other files."""
    dropped: list[tuple[list[Any], int]] = []
    broken_tables: set[int] = set()
    try:
        for detail in details:
            *parents, key = detail["loc"]
            if parents[:2] == ["counting", "where"]:
                broken_tables.add(parents[2] if len(parents) > 2 else key)
                continue
            holder: Any = raw
            for part in parents:
                holder = holder[part]
            if isinstance(holder, list):
                dropped.append((holder, key))
            elif key == "code":
                dropped.append((raw[parents[0]], parents[1]))
            elif key in _STAND_IN:
                holder[key] = _STAND_IN[key]
            else:
                holder.pop(key, None)
        if broken_tables:
            dropped += [(raw["counting"]["where"], place) for place in broken_tables]
        for listed, place in sorted(dropped, key=lambda d: -d[1]):
            del listed[place]
        return Contest.model_validate(raw)
    except (ValidationError, LookupError, TypeError, AttributeError):
        return None
