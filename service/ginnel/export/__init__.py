"""Answers as files: CSV with a Data Package descriptor beside it.

Only shows what `reports` answers: no sums, no SQL. A file appears whole or not at all.
"""

from ginnel.export.columns import Column
from ginnel.export.files import export_counts, export_passages, export_speeds
from ginnel.export.tables import Table, counts_table, passages_table, speeds_table

__all__ = [
    "Column",
    "Table",
    "counts_table",
    "export_counts",
    "export_passages",
    "export_speeds",
    "passages_table",
    "speeds_table",
]
