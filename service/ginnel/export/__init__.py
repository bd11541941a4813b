"""Answers as files, each with a descriptor beside it that says what its columns are.

Only shows what `reports` answers: no sums, no SQL. A file appears whole or not at all.
"""

from ginnel.export.columns import Column, Kind
from ginnel.export.files import Format, iter_lines, write, write_partitioned
from ginnel.export.tables import (
    TABLES,
    Question,
    Table,
    counts_table,
    health_table,
    occupancy_table,
    passages_table,
    speeds_table,
)

__all__ = [
    "TABLES",
    "Column",
    "Format",
    "Kind",
    "Question",
    "Table",
    "counts_table",
    "health_table",
    "iter_lines",
    "occupancy_table",
    "passages_table",
    "speeds_table",
    "write",
    "write_partitioned",
]
