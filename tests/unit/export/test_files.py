"""Files on the disk: whole or not at all, and a descriptor that an outside tool agrees with."""

from __future__ import annotations

import csv
import hashlib
import json
from collections.abc import Iterator
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest

from ginnel.errors import ExportError
from ginnel.export import TABLES, Format, Question, Table, passages_table, write
from ginnel.export.cells import Batch
from ginnel.store import LoggedHealth, Store, put_health, record_span
from ginnel.words import Direction, Flag, HealthSample, Mounting, MoverKind, Passage, Sensor, Span, Story

S = 1_000_000
NINE = 1_772_442_000 * S
NORTH = Sensor(
    name="north",
    approaching_name="to the workshops",
    receding_name="to the street",
    mounting=Mounting(beam_width_deg=(80.0, 40.0), since_us=NINE),
)


def export(store: Store, name: str, path: Path, kind: Format = Format.CSV) -> int:
    return write(store, [TABLES[name](store, Question())], path, kind)


@pytest.fixture(scope="module")
def filled(shared_store: Store) -> Store:
    store = shared_store
    plain = Passage(
        started_us=NINE + S,
        crossed_us=NINE + 2 * S + 1,
        ended_us=NINE + 3 * S,
        direction=Direction.RECEDING,
        direction_confidence=0.9,
        speed_mps=1.4,
        speed_se_mps=0.01,
        snr_db=12.5,
        mover=MoverKind.ON_WHEELS,
        flags=frozenset(Flag),
    )
    bare = replace(
        plain, crossed_us=NINE + 4 * S, ended_us=NINE + 5 * S, speed_mps=None, mover=None, snr_db=None
    )
    turned = replace(bare, crossed_us=NINE + 6 * S, ended_us=NINE + 7 * S, story=Story.TURN_BACK)
    for start_s, passages in ((0, [plain, bare, turned]), (7200, [])):
        span = Span(
            started_us=NINE + start_s * S, ended_us=NINE + (start_s + 3000) * S, sample_rate_hz=8000.0
        )
        record_span(store, NORTH, span, passages, "0.1")
    put_health(store, [LoggedHealth(sensor="north", sample=HealthSample(at_us=NINE + 60 * S))])
    return store


def described(path: Path) -> dict[str, Any]:
    return dict(json.loads(path.with_name(f"{path.stem}.datapackage.json").read_text(encoding="utf-8")))


@pytest.mark.filterwarnings("default")  # the outside tool's own
@pytest.mark.parametrize("subject", TABLES)
def test_an_outside_tool_finds_file_and_descriptor_valid(filled: Store, tmp_path: Path, subject: str) -> None:
    """frictionless knows the Data Package standard; it reads every cell by our descriptor."""
    from frictionless import validate

    path = tmp_path / f"{subject}.csv"
    n_rows = export(filled, subject, path)
    assert n_rows > 0
    report = validate(str(tmp_path / f"{subject}.datapackage.json"))
    assert report.valid, report.to_summary()
    assert report.tasks[0].stats["rows"] == n_rows
    # and it would find a cell that the descriptor does not allow
    path.write_text(
        path.read_text(encoding="utf-8").replace("receding", "sideways"), encoding="utf-8", newline=""
    )
    assert not validate(str(tmp_path / f"{subject}.datapackage.json")).valid


@pytest.mark.parametrize("subject", TABLES)
def test_the_descriptor_describes_the_file(filled: Store, tmp_path: Path, subject: str) -> None:
    path = tmp_path / f"{subject}.csv"
    export(filled, subject, path)
    facts = described(path)
    (resource,) = facts["resources"]
    data = path.read_bytes()
    assert resource["path"] == path.name
    assert resource["bytes"] == len(data)
    assert resource["hash"] == f"sha256:{hashlib.sha256(data).hexdigest()}"
    with path.open(encoding="utf-8", newline="") as stream:
        header = next(csv.reader(stream))
    assert [field["name"] for field in resource["schema"]["fields"]] == header
    assert all(field["description"] for field in resource["schema"]["fields"])
    units = {field["name"]: field.get("unit") for field in resource["schema"]["fields"]}
    assert all(units[name] == "m/s" for name in header if name.endswith("_mps"))
    assert facts["ginnel"]["site"] == {"name": "Tannery annex", "timezone": "Europe/Dublin"}
    (sensor,) = facts["ginnel"]["sensors"]
    assert sensor["chain_versions"] == ["0.1"]
    assert sensor["directions"] == {"approaching": "to the workshops", "receding": "to the street"}
    assert sensor["mountings"][0]["beam_width_deg"] == [80.0, 40.0]
    assert sensor["mountings"][0]["since"] == "2026-03-02T09:00:00.000000Z"


def test_the_percentile_method_is_stated(filled: Store, tmp_path: Path) -> None:
    export(filled, "speeds", tmp_path / "speeds.csv")
    (resource,) = described(tmp_path / "speeds.csv")["resources"]
    (p85,) = [field for field in resource["schema"]["fields"] if field["name"] == "p85_mps"]
    assert "Hyndman-Fan type 7" in p85["description"]


def test_exporting_again_gives_the_same_bytes(filled: Store, tmp_path: Path) -> None:
    for subject in TABLES:
        export(filled, subject, tmp_path / f"{subject}.csv")
        before = {path.name: path.read_bytes() for path in tmp_path.glob(f"{subject}*")}
        export(filled, subject, tmp_path / f"{subject}.csv")
        assert {path.name: path.read_bytes() for path in tmp_path.glob(f"{subject}*")} == before
        assert len(before) == 2


def test_times_read_back_to_the_microsecond(filled: Store, tmp_path: Path) -> None:
    export(filled, "passages", tmp_path / "p.csv")
    with (tmp_path / "p.csv").open(encoding="utf-8", newline="") as stream:
        first = next(csv.DictReader(stream))
    crossed = datetime.fromisoformat(first["crossed_at"])
    assert round(crossed.timestamp() * 1e6) == NINE + 2 * S + 1
    assert first["passage_id"] == f"north-{NINE + 2 * S + 1}"


def test_a_failing_export_leaves_the_old_file(filled: Store, tmp_path: Path) -> None:
    path = tmp_path / "passages.csv"
    export(filled, "passages", path)
    before = {one.name: one.read_bytes() for one in tmp_path.iterdir()}

    whole = list(passages_table(filled, Question()).batches)

    def broken() -> Iterator[Batch]:
        yield from whole
        raise RuntimeError("the store went away")

    table: Table = replace(passages_table(filled, Question()), batches=broken())
    with pytest.raises(RuntimeError, match="went away"):
        write(filled, [table], path)
    assert {one.name: one.read_bytes() for one in tmp_path.iterdir()} == before


def test_a_file_that_cannot_be_written_is_one_clear_line(filled: Store, tmp_path: Path) -> None:
    with pytest.raises(ExportError, match=r"there is no folder .*nowhere: make it first"):
        export(filled, "passages", tmp_path / "nowhere" / "p.csv")
    with pytest.raises(ExportError, match="is not a file"):
        export(filled, "passages", tmp_path)


def test_new_files_have_the_usual_permissions(filled: Store, tmp_path: Path) -> None:
    (tmp_path / "plain").touch()
    export(filled, "counts", tmp_path / "c.csv")
    assert (tmp_path / "c.csv").stat().st_mode == (tmp_path / "plain").stat().st_mode
    assert (tmp_path / "c.datapackage.json").stat().st_mode == (tmp_path / "plain").stat().st_mode
