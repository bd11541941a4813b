"""Writing tables: to a file with its descriptor, or to a text stream."""

from __future__ import annotations

import csv
import hashlib
import json
import os
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TextIO

from ginnel.errors import ExportError
from ginnel.export.descriptor import descriptor
from ginnel.export.tables import Table, counts_table, passages_table, speeds_table
from ginnel.reports import Every
from ginnel.store import Store

Output = Path | TextIO


def export_passages(
    store: Store,
    output: Output,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    *,
    with_uncounted: bool = False,
) -> int:
    """Write passages as CSV; returns the number of rows."""
    return write(
        store, passages_table(store, sensors, start_us, end_us, with_uncounted=with_uncounted), output
    )


def export_counts(
    store: Store,
    output: Output,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
) -> int:
    """Write counts as CSV; returns the number of rows."""
    return write(store, counts_table(store, sensors, start_us, end_us, every), output)


def export_speeds(
    store: Store,
    output: Output,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
) -> int:
    """Write speeds as CSV; returns the number of rows."""
    return write(store, speeds_table(store, sensors, start_us, end_us, every), output)


def write(store: Store, table: Table, output: Output) -> int:
    """Write a table to a text stream, or to a file with its descriptor ``NAME.datapackage.json`` beside it.

    A file appears whole or not at all; one of the same name is replaced.

    Raises
    ------
    ExportError
        The file cannot be written.
    """
    if not isinstance(output, Path):
        return write_csv(table, output)
    path = output.resolve()
    if path.exists() and not path.is_file():
        raise ExportError(f"{output} is not a file: give a file name, or none for standard output")
    if not path.parent.is_dir():
        raise ExportError(f"{output} cannot be written: there is no folder {output.parent}: make it first")
    beside = path.with_name(f"{path.stem}.datapackage.json")
    with _whole(path) as draft:
        with draft.open("w", encoding="utf-8", newline="") as stream:
            n_rows = write_csv(table, stream)
        with draft.open("rb") as data:
            sha256 = hashlib.file_digest(data, "sha256").hexdigest()
        facts = descriptor(store, table, path.name, draft.stat().st_size, sha256)
        with _whole(beside) as note:
            note.write_text(json.dumps(facts, indent=2, ensure_ascii=False) + "\n", encoding="utf-8")
    return n_rows


def write_csv(table: Table, stream: TextIO) -> int:
    """Write header and rows by RFC 4180; returns the number of rows."""
    writer = csv.writer(stream, lineterminator="\r\n")
    writer.writerow(column.name for column in table.columns)
    n_rows = 0
    for row in table.rows:
        writer.writerow(row)
        n_rows += 1
    return n_rows


@contextmanager
def _whole(path: Path) -> Iterator[Path]:
    """Give a draft to write, which takes the file's name once it is on the disk, or goes."""
    draft = path.with_name(f".{path.name}.{os.getpid()}.draft")
    try:
        draft.touch()
        yield draft
        with draft.open("rb+") as stream:
            os.fsync(stream.fileno())
        draft.replace(path)
    except OSError as error:
        raise ExportError(f"{path} cannot be written: {error.strerror or error}") from error
    finally:
        draft.unlink(missing_ok=True)
