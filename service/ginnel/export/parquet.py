"""Parquet: one file, or a data set of a folder for each sensor and month that analysis tools read as one.

Texts are strings, moments carry their zone, blanks are nulls; meaning and unit of a column are its metadata.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from datetime import tzinfo
from pathlib import Path
from typing import Any

import numpy as np

from ginnel.export.cells import Batch, Cells, Numbered, is_moments, rounded
from ginnel.export.columns import Column, Kind
from ginnel.export.libraries import optional
from ginnel.export.tables import Table
from ginnel.store import Coded

_GROUP_ROWS = 100_000


def write_parquet(table: Table, path: Path) -> int:
    """Write a table as one Parquet file, a row group at a time; returns the number of rows."""
    pa, pq = _arrow()
    schema = _schema(pa, table)
    written = 0
    with pq.ParquetWriter(path, schema, compression="zstd") as writer:
        for group in _groups(pa, schema, table):
            writer.write_table(group, row_group_size=_GROUP_ROWS)
            written += group.num_rows
    return written


def write_dataset(table: Table, folder: Path) -> int:
    """Write passages as a data set partitioned by sensor and by month of the site's clock.

    The layout is ``sensor=NAME/month=YYYY-MM/part-0.parquet``, which DuckDB, Polars, Dask, pandas and Spark
    know; both names come back as columns. Returns the number of rows.
    """
    pa, _ = _arrow()
    dataset = optional("pyarrow.dataset", "pyarrow", "Parquet")
    schema = _schema(pa, table).append(pa.field("month", pa.string()))
    written = 0

    def batches() -> Iterator[Any]:
        nonlocal written
        for group in _groups(pa, _schema(pa, table), table):
            local = group["crossed_at"].cast(pa.timestamp("us", tz=table.zone.key))
            month = optional("pyarrow.compute", "pyarrow", "Parquet").strftime(local, format="%Y-%m")
            written += group.num_rows
            yield from group.append_column("month", month).cast(schema).to_batches()

    dataset.write_dataset(
        batches(),
        folder,
        schema=schema,
        format="parquet",
        partitioning=dataset.partitioning(
            pa.schema([schema.field("sensor"), schema.field("month")]), flavor="hive"
        ),
        basename_template="part-{i}.parquet",
        file_options=dataset.ParquetFileFormat().make_write_options(compression="zstd"),
        max_rows_per_group=_GROUP_ROWS,
        max_open_files=64,
    )
    return written


def _arrow() -> tuple[Any, Any]:
    return optional("pyarrow", "pyarrow", "Parquet"), optional("pyarrow.parquet", "pyarrow", "Parquet")


def _schema(pa: Any, table: Table) -> Any:
    return pa.schema(
        [
            pa.field(
                column.name,
                _type(pa, column, table.zone),
                nullable=not column.required,
                metadata={"description": column.description, "unit": column.unit},
            )
            for column in table.columns
        ]
    )


def _type(pa: Any, column: Column, zone: tzinfo) -> Any:
    if column.kind is Kind.MOMENT:
        return pa.timestamp("us", tz=str(zone) if column.local else "UTC")
    return {Kind.TEXT: pa.string(), Kind.NUMBER: pa.float64(), Kind.WHOLE: pa.int64()}[column.kind]


def _groups(pa: Any, schema: Any, table: Table) -> Iterator[Any]:
    """Gather batches into tables as large as a row group."""
    waiting: list[Any] = []
    for batch in table.batches:
        waiting.append(_record_batch(pa, schema, table.columns, batch))
        if sum(one.num_rows for one in waiting) >= _GROUP_ROWS:
            yield pa.Table.from_batches(waiting, schema)
            waiting = []
    if waiting:
        yield pa.Table.from_batches(waiting, schema)


def _record_batch(pa: Any, schema: Any, columns: Iterable[Column], batch: Batch) -> Any:
    arrays = [
        _array(pa, field.type, column, cells)
        for field, column, cells in zip(schema, columns, batch, strict=True)
    ]
    return pa.record_batch(arrays, schema=schema)


def _array(pa: Any, type_: Any, column: Column, cells: Cells) -> Any:
    if isinstance(cells, Coded):
        words = pa.array([word or None for word in cells.words], pa.string())
        return pa.DictionaryArray.from_arrays(pa.array(cells.codes), words).dictionary_decode()
    if isinstance(cells, Numbered):
        compute = optional("pyarrow.compute", "pyarrow", "Parquet")
        number = pa.array(cells.number).cast(pa.string())
        return compute.binary_join_element_wise(_array(pa, type_, column, cells.word), number, "-")
    if is_moments(cells):
        return pa.array(cells).cast(type_) if cells.size else pa.array([], type_)
    blank = ~np.isfinite(cells)
    numbers = np.where(blank, 0.0, rounded(column, cells))
    if column.kind is Kind.WHOLE:
        return pa.array(numbers.astype(np.int64), mask=blank)
    return pa.array(numbers, mask=blank)
