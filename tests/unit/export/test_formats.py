"""Every kind of file, opened by the tools that people have: pandas, openpyxl, DuckDB, pyarrow, frictionless.

What a CSV says, by Python's own csv module, is what every other kind must say.
"""

from __future__ import annotations

import csv
import json
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import duckdb
import openpyxl
import pandas as pd
import pyarrow.parquet as pq
import pytest

from ginnel.errors import ExportError
from ginnel.export import TABLES, Format, Question, passages_table, write, write_partitioned
from ginnel.export.columns import Kind
from ginnel.export.workbook import write_workbook
from ginnel.store import LoggedHealth, Store, put_health, record_span
from ginnel.words import Direction, Flag, HealthSample, MoverKind, Passage, Sensor, Span

S = 1_000_000
HOUR = 3600 * S
DUBLIN = ZoneInfo("Europe/Dublin")
NINE = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
SUMMER = 1_774_746_000 * S  # 2026-03-29T01:00:00Z, when Dublin's clock goes from 1 to 2


@pytest.fixture(scope="module")
def filled(shared_store: Store) -> Store:
    store = shared_store
    full = Passage(
        started_us=NINE + S,
        crossed_us=NINE + 2 * S + 123_456,
        ended_us=NINE + 3 * S,
        direction=Direction.RECEDING,
        direction_confidence=0.9,
        speed_mps=1.4,
        speed_se_mps=0.01,
        snr_db=-12.5,
        mover=MoverKind.ON_WHEELS,
        flags=frozenset({Flag.CUT, Flag.CLIPPED}),
    )
    bare = replace(full, crossed_us=NINE + 9 * S, speed_mps=None, mover=None, snr_db=None, flags=frozenset())
    summer = replace(full, started_us=SUMMER, crossed_us=SUMMER + S, ended_us=SUMMER + 2 * S)
    nasty = Sensor(name='=1+1,"2"')
    for sensor in (Sensor(name="north"), nasty):
        record_span(store, sensor, _span(NINE, NINE + HOUR // 2), [full, bare], "1")
        record_span(store, sensor, _span(NINE + 2 * HOUR, NINE + 3 * HOUR), [], "1")
        record_span(store, sensor, _span(SUMMER - HOUR, SUMMER + HOUR), [summer], "1")
        sample = HealthSample(at_us=NINE + 60 * S, listened_s=60.0, hum_db=12.125, dropped_samples=3)
        put_health(store, [LoggedHealth(sensor=sensor.name, sample=sample)])
    return store


def _span(start_us: int, end_us: int) -> Span:
    return Span(started_us=start_us, ended_us=end_us, sample_rate_hz=8000.0)


def wanted(store: Store, name: str, folder: Path) -> list[dict[str, Any]]:
    """What the CSV says, as values; the apostrophe before formulas is the CSV's own."""
    write(store, [TABLES[name](store, Question())], folder / "judge.csv")
    kinds = {column.name: column.kind for column in TABLES[name](store, Question()).columns}
    with (folder / "judge.csv").open(encoding="utf-8", newline="") as stream:
        return [
            {key: _value(kinds[key], text) for key, text in row.items()} for row in csv.DictReader(stream)
        ]


def _value(kind: Kind, text: str) -> object:
    if text == "":
        return None
    if kind is Kind.MOMENT:
        return datetime.fromisoformat(text)
    if kind is Kind.TEXT:
        return text.removeprefix("'")
    return float(text) if kind is Kind.NUMBER else int(text)


@pytest.mark.parametrize("name", TABLES)
def test_json_lines(filled: Store, tmp_path: Path, name: str) -> None:
    path = tmp_path / "x.jsonl"
    n_rows = write(filled, [TABLES[name](filled, Question())], path, Format.JSONL)
    rows = [json.loads(line) for line in path.read_text("utf-8").splitlines()]
    times = [column.name for column in TABLES[name](filled, Question()).columns if column.kind is Kind.MOMENT]
    for row in rows:
        row |= {key: datetime.fromisoformat(row[key]) for key in times}
    assert rows == wanted(filled, name, tmp_path)
    assert len(rows) == n_rows > 0
    assert len(pd.read_json(path, lines=True)) == n_rows


@pytest.mark.parametrize("name", TABLES)
def test_parquet(filled: Store, tmp_path: Path, name: str) -> None:
    path = tmp_path / "x.parquet"
    write(filled, [TABLES[name](filled, Question())], path, Format.PARQUET)
    table = pq.read_table(path)
    rows = wanted(filled, name, tmp_path)
    assert table.to_pylist() == rows
    metadata = table.schema.field("sensor").metadata
    assert metadata[b"description"] == b"name of the sensor"
    held = duckdb.execute(f"select count(*), count(distinct sensor) from '{path}'").fetchone()
    assert held == (len(rows), 2)
    assert (
        json.loads((tmp_path / "x.datapackage.json").read_text("utf-8"))["resources"][0]["format"]
        == "parquet"
    )


def test_parquet_moments_carry_their_zone(filled: Store, tmp_path: Path) -> None:
    for name, zone, column in (
        ("passages", "UTC", "crossed_at"),
        ("counts", "Europe/Dublin", "interval_start"),
    ):
        path = tmp_path / f"{name}.parquet"
        write(filled, [TABLES[name](filled, Question())], path, Format.PARQUET)
        assert str(pd.read_parquet(path)[column].dtype) == f"datetime64[us, {zone}]"


def test_a_workbook_has_a_sheet_a_table_with_real_dates_and_notes(filled: Store, tmp_path: Path) -> None:
    path = tmp_path / "x.xlsx"
    n_rows = write(filled, [table(filled, Question()) for table in TABLES.values()], path, Format.XLSX)
    book = openpyxl.load_workbook(path)
    assert book.sheetnames == [*TABLES, "about"]
    assert sum(book[name].max_row - 1 for name in TABLES) == n_rows
    for name in TABLES:
        sheet = book[name]
        columns = TABLES[name](filled, Question()).columns
        assert [cell.value for cell in sheet[1]] == [column.name for column in columns]
        for cell, column in zip(sheet[1], columns, strict=True):
            assert cell.comment.text.startswith(column.description)
        zones = [DUBLIN if column.local else UTC for column in columns]
        for cells, row in zip(sheet.iter_rows(min_row=2), wanted(filled, name, tmp_path), strict=True):
            for cell, value, zone in zip(cells, row.values(), zones, strict=True):
                if isinstance(value, datetime):
                    # a day in floating point holds a millisecond, not a microsecond
                    assert abs(cell.value - value.astimezone(zone).replace(tzinfo=None)) < timedelta(
                        milliseconds=1
                    )
                else:
                    assert cell.value == value
    book.close()


def test_no_text_in_a_workbook_is_a_formula(filled: Store, tmp_path: Path) -> None:
    write(filled, [passages_table(filled, Question())], tmp_path / "x.xlsx", Format.XLSX)
    book = openpyxl.load_workbook(tmp_path / "x.xlsx")
    cells = [cell for row in book["passages"].iter_rows() for cell in row]
    assert sum(cell.value == '=1+1,"2"' for cell in cells) == 3
    assert all(cell.data_type != "f" for cell in cells)
    book.close()


def test_more_rows_than_a_sheet_holds_are_refused(
    filled: Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("ginnel.export.workbook._ROWS_A_SHEET", 6)
    with pytest.raises(ExportError, match="sheet holds 5 rows, and there are more passages"):
        write(filled, [passages_table(filled, Question())], tmp_path / "x.xlsx", Format.XLSX)
    assert list(tmp_path.iterdir()) == []


def test_csv_opens_in_duckdb_and_pandas(filled: Store, tmp_path: Path) -> None:
    path = tmp_path / "x.csv"
    n_rows = write(filled, [passages_table(filled, Question())], path)
    types = dict(
        duckdb.execute(f"describe select * from read_csv('{path}')").fetchall()[i][:2] for i in (3, 7)
    )
    assert types == {"crossed_at": "TIMESTAMP WITH TIME ZONE", "speed_mps": "DOUBLE"}
    frame = pd.read_csv(path, parse_dates=["crossed_at"])
    assert len(frame) == n_rows
    assert str(frame["crossed_at"].dt.tz) == "UTC"


@pytest.mark.filterwarnings("default")  # the outside tool's own
@pytest.mark.parametrize("name", TABLES)
@pytest.mark.parametrize("kind", [Format.CSV, Format.JSONL, Format.XLSX])
def test_frictionless_reads_every_cell_by_the_descriptor(
    filled: Store, tmp_path: Path, name: str, kind: Format
) -> None:
    from frictionless import validate

    path = tmp_path / f"x.{kind.value}"
    n_rows = write(filled, [TABLES[name](filled, Question())], path, kind)
    report = validate(str(tmp_path / "x.datapackage.json"))
    assert report.valid, report.to_summary()
    assert report.tasks[0].stats["rows"] == n_rows


def test_a_data_set_is_one_table_by_sensor_and_month(store: Store, tmp_path: Path) -> None:
    """DuckDB and pyarrow read the folder; a month is the site's, which is why the last hour of one tells."""
    edge = 1_777_589_400 * S  # 2026-04-30T22:50Z, still April in Dublin (23:50)
    late = [
        replace(_passage(), started_us=us, crossed_us=us, ended_us=us) for us in (edge, edge + 15 * 60 * S)
    ]
    for name in ("north", '=1+1,"2"'):
        record_span(store, Sensor(name=name), _span(edge - HOUR, edge + HOUR), late, "1")
    folder = tmp_path / "log"
    n_rows = write_partitioned(store, passages_table(store, Question()), folder)
    files = sorted(path.relative_to(folder).as_posix() for path in folder.rglob("*.parquet"))
    assert files[-2:] == [f"sensor=north/month=2026-0{m}/part-0.parquet" for m in (4, 5)]
    held = duckdb.execute(
        "select sensor, month::text, count(*) "
        f"from read_parquet('{folder}/**/*.parquet', hive_partitioning=true) group by all order by all"
    ).fetchall()
    assert held == [
        ('=1+1,"2"', "2026-04", 1),
        ('=1+1,"2"', "2026-05", 1),
        ("north", "2026-04", 1),
        ("north", "2026-05", 1),
    ]
    assert len(pd.read_parquet(folder)) == n_rows == 4
    note = json.loads((tmp_path / "log.datapackage.json").read_text("utf-8"))
    assert note["resources"][0]["path"] == [f"log/{file}" for file in files]
    inside = pq.ParquetFile(folder / files[-1]).schema_arrow.names
    assert [field["name"] for field in note["resources"][0]["schema"]["fields"]] == inside


def _passage() -> Passage:
    return Passage(
        started_us=0,
        crossed_us=0,
        ended_us=0,
        direction=Direction.UNKNOWN,
        direction_confidence=None,
        speed_mps=None,
        speed_se_mps=None,
        snr_db=None,
    )


def test_a_data_set_never_goes_into_a_folder_in_use(filled: Store, tmp_path: Path) -> None:
    (tmp_path / "kept").touch()
    with pytest.raises(ExportError, match="is there already: give the name of a new folder"):
        write_partitioned(filled, passages_table(filled, Question()), tmp_path)
    assert [path.name for path in tmp_path.iterdir()] == ["kept"]


def test_hours_from_the_data_set_agree_with_the_counts(filled: Store, tmp_path: Path) -> None:
    write_partitioned(filled, passages_table(filled, Question()), tmp_path / "log")
    passages = pd.read_parquet(tmp_path / "log")
    hours = passages["crossed_at"].dt.tz_convert("Europe/Dublin").dt.floor("h")
    found = passages.groupby([passages["sensor"].astype(str), hours, "direction"]).size()
    counted = {
        (row["sensor"], row["interval_start"], row["direction"]): row["count"]
        for row in wanted(filled, "counts", tmp_path)
        if row["count"]
    }
    assert {(s, t.to_pydatetime(), d): n for (s, t, d), n in found.items()} == counted


@pytest.mark.parametrize(("kind", "library"), [(Format.PARQUET, "pyarrow"), (Format.XLSX, "xlsxwriter")])
def test_a_missing_library_is_one_clear_line(
    filled: Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, kind: Format, library: str
) -> None:
    monkeypatch.setitem(__import__("sys").modules, library, None)
    with pytest.raises(ExportError, match=f"needs {library}: pip install {library}"):
        write(filled, [passages_table(filled, Question())], tmp_path / "x", kind)
    assert list(tmp_path.iterdir()) == []


def test_an_empty_log_makes_files_too(store: Store, tmp_path: Path) -> None:
    for kind in (Format.PARQUET, Format.XLSX, Format.JSONL):
        assert write(store, [passages_table(store, Question())], tmp_path / f"x.{kind.value}", kind) == 0
    assert pq.read_table(tmp_path / "x.parquet").num_rows == 0
    assert write_workbook([passages_table(store, Question())], tmp_path / "again.xlsx") == 0
