"""Excel workbooks: a sheet for each table and one that tells of the columns.

Dates are real ones. A workbook's dates know no zones: they show UTC or the site's clock, as the note at
each column's head says. Texts are written as texts, so none is ever a formula.
"""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

from ginnel.errors import ExportError
from ginnel.export.cells import n_rows, values
from ginnel.export.columns import Column, Kind
from ginnel.export.libraries import optional
from ginnel.export.tables import Table

_ROWS_A_SHEET = 1_048_576  # of the file format
_MOMENT_FORMATS = {True: "yyyy-mm-dd hh:mm:ss", False: "yyyy-mm-dd hh:mm:ss.000"}  # by column.local


def write_workbook(tables: Sequence[Table], path: Path) -> int:
    """Write tables, a row at a time, so that a long one takes little memory; returns the number of rows.

    Raises
    ------
    ExportError
        A table has more rows than a sheet holds.
    """
    library = optional("xlsxwriter", "xlsxwriter", "an Excel workbook")
    exceptions = optional("xlsxwriter.exceptions", "xlsxwriter", "an Excel workbook")
    options = {
        "constant_memory": True,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
    }
    # the parts lie where there must be room for the whole anyway
    with TemporaryDirectory(prefix=f"{path.name}.", suffix=".parts", dir=path.parent) as parts:
        book = library.Workbook(str(path), options | {"tmpdir": parts})
        try:
            written = sum(_write_sheet(book, table) for table in tables)
            _write_notes(book, tables)
            book.close()
        except exceptions.FileCreateError as error:
            raise error.args[0] from error  # the OSError that it hides
        finally:
            for sheet in book.worksheets():
                sheet.row_data_fh.close()  # left open by the library where the work breaks off
    return written


def _write_sheet(book: Any, table: Table) -> int:
    sheet = book.add_worksheet(table.name)
    bold = book.add_format({"bold": True})
    sheet.freeze_panes(1, 0)
    for at, column in enumerate(table.columns):
        sheet.set_column(at, at, 24 if column.kind is Kind.MOMENT or column.name == "passage_id" else 14)
        sheet.write_string(0, at, column.name, bold)
        sheet.write_comment(0, at, _note(column, table), {"x_scale": 2})
    formats = [_format(book, column) for column in table.columns]
    row_idx = 1
    for batch in table.batches:
        if row_idx + n_rows(batch) > _ROWS_A_SHEET:
            raise ExportError(
                f"an Excel sheet holds {_ROWS_A_SHEET - 1} rows, and there are more {table.name}: "
                "choose a shorter time or another --format"
            )
        columns = [
            values(column, cells, table.zone if column.local else UTC)
            for column, cells in zip(table.columns, batch, strict=True)
        ]
        for row in zip(*columns, strict=True):
            _write_row(sheet, row_idx, row, formats)
            row_idx += 1
    return row_idx - 1


def _write_row(sheet: Any, row_idx: int, row: Sequence[object], formats: Sequence[Any]) -> None:
    for at, value in enumerate(row):
        if value is None:
            continue
        if isinstance(value, str):
            sheet.write_string(row_idx, at, value)
        elif isinstance(value, datetime):
            sheet.write_datetime(row_idx, at, value.replace(tzinfo=None), formats[at])
        else:
            sheet.write_number(row_idx, at, value, formats[at])


def _format(book: Any, column: Column) -> Any:
    if column.kind is Kind.MOMENT:
        return book.add_format({"num_format": _MOMENT_FORMATS[column.local]})
    if column.kind is Kind.NUMBER:
        return book.add_format({"num_format": f"0.{'0' * column.decimals}"})
    return None


def _note(column: Column, table: Table) -> str:
    lines = [column.description]
    if column.unit and column.unit != "1":
        lines.append(f"unit: {column.unit}")
    if column.local:
        lines.append(f"{table.zone}; the hour that the clock shows twice in autumn comes twice, in order")
    return "\n".join(lines)


def _write_notes(book: Any, tables: Sequence[Table]) -> None:
    """Tell of every column once more, where it can be read and printed."""
    sheet = book.add_worksheet("about")
    sheet.set_column(0, 1, 22)
    sheet.set_column(2, 2, 100)
    bold = book.add_format({"bold": True})
    for at, head in enumerate(("sheet", "column", "meaning")):
        sheet.write_string(0, at, head, bold)
    rows = [
        (table.name, column.name, _note(column, table).replace("\n", "; "))
        for table in tables
        for column in table.columns
    ]
    for row_idx, row in enumerate(rows, start=1):
        for at, text in enumerate(row):
            sheet.write_string(row_idx, at, textwrap.shorten(text, 1000))
