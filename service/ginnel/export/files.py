"""Writing tables: to a file with its descriptor beside it, or to a stream."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from enum import StrEnum
from pathlib import Path
from typing import Any, BinaryIO

from ginnel.errors import ExportError
from ginnel.export.cells import n_rows
from ginnel.export.descriptor import descriptor, resource
from ginnel.export.draft import check_place, whole, whole_folder
from ginnel.export.lines import csv_header, csv_lines, json_lines
from ginnel.export.tables import Table
from ginnel.store import Store


class Format(StrEnum):
    """Kinds of files."""

    CSV = "csv"
    JSONL = "jsonl"
    PARQUET = "parquet"
    XLSX = "xlsx"


def write(store: Store, tables: Sequence[Table], output: Path | BinaryIO, kind: Format = Format.CSV) -> int:
    """Write a table to a stream, or to a file with its descriptor ``NAME.datapackage.json`` beside it.

    A workbook may hold several tables, other files hold one. A file appears whole or not at all; one
    of the same name is replaced. Returns the number of rows.

    Raises
    ------
    ExportError
        The file cannot be written, or this kind of file needs a library that is not there.
    """
    if len(tables) != 1 and kind is not Format.XLSX:
        raise ExportError("only a workbook (xlsx) holds more than one table")
    if not isinstance(output, Path):
        if kind not in _LINES:
            raise ExportError(f"{kind.value} needs a file: give its name")
        return _write_lines(tables[0], output, kind)
    path = check_place(output)
    beside = path.with_name(f"{path.stem}.datapackage.json")
    with whole(path) as draft:
        written = _write_file(tables, draft, kind)
        with draft.open("rb") as data:
            sha256 = hashlib.file_digest(data, "sha256").hexdigest()
        size = {"bytes": draft.stat().st_size, "hash": f"sha256:{sha256}"}
        resources = [resource(table, kind.value, path.name) | size for table in tables]
        with whole(beside) as note:
            note.write_text(_json(descriptor(store, tables, resources)), encoding="utf-8")
    return written


def write_partitioned(store: Store, table: Table, folder: Path) -> int:
    """Write passages as a Parquet data set in a new folder, with its descriptor beside it; returns the rows.

    Raises
    ------
    ExportError
        There is something at that name already, or it cannot be written.
    """
    from ginnel.export.parquet import write_dataset

    path = folder.absolute()
    # beside and not inside: some readers take every file of the folder for a part
    beside = path.with_name(f"{path.name}.datapackage.json")
    with whole_folder(path) as draft:
        written = write_dataset(table, draft)
        parts = sorted(part.relative_to(draft).as_posix() for part in draft.rglob("*.parquet"))
        inside = replace(table, columns=tuple(column for column in table.columns if column.name != "sensor"))
        facts = resource(inside, Format.PARQUET.value, [f"{path.name}/{part}" for part in parts])
        with whole(beside) as note:
            note.write_text(_json(descriptor(store, [table], [facts])), encoding="utf-8")
    return written


def iter_lines(table: Table, kind: Format = Format.CSV) -> Iterator[bytes]:
    """Give a table as pieces of text, in UTF-8, each some thousands of whole lines."""
    if kind is Format.CSV:
        yield csv_header(table.columns)
    for batch in table.batches:
        yield _LINES[kind](table.columns, batch, table.zone)


_LINES: dict[Format, Callable[..., bytes]] = {Format.CSV: csv_lines, Format.JSONL: json_lines}


def _json(facts: dict[str, Any]) -> str:
    return json.dumps(facts, indent=2, ensure_ascii=False) + "\n"


def _write_lines(table: Table, stream: BinaryIO, kind: Format) -> int:
    written = 0
    if kind is Format.CSV:
        stream.write(csv_header(table.columns))
    for batch in table.batches:
        stream.write(_LINES[kind](table.columns, batch, table.zone))
        written += n_rows(batch)
    return written


def _write_file(tables: Sequence[Table], path: Path, kind: Format) -> int:
    if kind is Format.XLSX:
        from ginnel.export.workbook import write_workbook

        return write_workbook(tables, path)
    if kind is Format.PARQUET:
        from ginnel.export.parquet import write_parquet

        return write_parquet(tables[0], path)
    with path.open("wb") as stream:
        return _write_lines(tables[0], stream, kind)
