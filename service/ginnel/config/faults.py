"""What is wrong with the settings, in words: one line each, with file, line and key."""

from __future__ import annotations

import difflib
import re
from collections.abc import Mapping
from pathlib import Path

from pydantic import BaseModel, ValidationError

_HEADER = re.compile(r"^\s*(\[\[?)\s*([^\[\]#]+?)\s*\]")
_ENTRY = re.compile(r"^\s*([A-Za-z0-9_\-\"']+)\s*=")

#: What the patterns of the settings mean, by key.
_PATTERNS = {
    "name": "must be letters, digits, dot, dash and underscore, and begin with a letter or digit",
    "sample_type": "must be r or c, then i8, u8, i16, i24, i32, f32 or f64, then _le or _be, as in ri16_le",
    "url": "must be sqlite:///FILE or postgresql+psycopg://USER@HOST/NAME",
}


def describe(
    exc: ValidationError, path: Path | None, text: str, environ: Mapping[str, str], root: type[BaseModel]
) -> list[str]:
    """Give one line for each thing that is wrong."""
    lines = find_lines(text)
    found = []
    for error in exc.errors(include_url=False):
        loc = tuple(str(part) for part in error["loc"])
        found.append(f"{_where(loc, path, lines, environ)}: {_key(loc)}{_what(dict(error), loc, root)}")
    return found


def find_lines(text: str) -> dict[tuple[str, ...], int]:
    """Find the line of each table and key; tables in arrays count from 0.

    Follows only the plain way of writing TOML that ``ginnel init`` writes; a key that is
    written another way has no line, and the message then does without.
    """
    lines: dict[tuple[str, ...], int] = {}
    counts: dict[tuple[str, ...], int] = {}
    table: tuple[str, ...] = ()
    for number, line in enumerate(text.splitlines(), start=1):
        if header := _HEADER.match(line):
            parts = [part.strip().strip("\"'") for part in header[2].split(".")]
            is_array = header[1] == "[["
            table = ()
            for depth, part in enumerate(parts):
                table += (part,)
                if depth == len(parts) - 1 and is_array:
                    counts[table] = counts.get(table, -1) + 1
                if table in counts:
                    table += (str(counts[table]),)
            lines[table] = number
        elif entry := _ENTRY.match(line):
            lines[(*table, entry[1].strip("\"'"))] = number
    return lines


def _where(
    loc: tuple[str, ...], path: Path | None, lines: Mapping[tuple[str, ...], int], environ: Mapping[str, str]
) -> str:
    names = {key.lower(): key for key in environ}
    for length in range(len(loc), 0, -1):
        variable = names.get("ginnel_" + "__".join(loc[:length]).lower())
        if variable is not None:
            return f"environment variable {variable}"
        if loc[:length] in lines and path is not None:
            return f"{path}, line {lines[loc[:length]]}"
    return str(path) if path is not None else "environment"


def _key(loc: tuple[str, ...]) -> str:
    """``sensor[0].mounting.height_m: `` as one would say it."""
    key = "".join(f"[{part}]" if part.isdigit() else f".{part}" for part in loc).lstrip(".")
    return f"{key}: " if key else ""


def _what(error: dict[str, object], loc: tuple[str, ...], root: type[BaseModel]) -> str:
    if error["type"] == "extra_forbidden":
        near = difflib.get_close_matches(loc[-1], _keys_beside(loc, root), n=1)
        near = near or difflib.get_close_matches(loc[-1], set(_known_keys(root)) - {loc[-1]}, n=1)
        return "unknown key" + (f"; did you mean {near[0]}?" if near else "")
    if error["type"] == "string_pattern_mismatch" and loc[-1] in _PATTERNS:
        return f"{_PATTERNS[loc[-1]]} (it is {error.get('input')!r})"
    message = str(error["msg"]).removeprefix("Value error, ").replace("Input should be", "must be")
    given = error.get("input")
    shown = f" (it is {given!r})" if isinstance(given, str | int | float) else ""
    return message + shown


def _keys_beside(loc: tuple[str, ...], root: type[BaseModel]) -> list[str]:
    """Keys that the table of an unknown key does have."""
    schema = root.model_json_schema()
    table = schema
    for part in loc[:-1]:
        inner = table["items"] if part.isdigit() else table["properties"][part]
        table = schema["$defs"][inner["$ref"].rsplit("/", 1)[-1]] if "$ref" in inner else inner
    return list(table.get("properties", {}))


def _known_keys(model: type[BaseModel]) -> list[str]:
    """Every key of the tree, at whatever depth."""
    keys: list[str] = []
    for definition in (model.model_json_schema(), *model.model_json_schema().get("$defs", {}).values()):
        keys.extend(definition.get("properties", {}))
    return keys
