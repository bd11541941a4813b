"""`ginnel export` as a process: what it leaves behind when it is stopped, and when the disk is full."""

from __future__ import annotations

import csv
import os
import resource
import signal
import subprocess
import time
from pathlib import Path

import openpyxl
import pytest
from click.testing import CliRunner
from sqlalchemy import insert
from tests.system.conftest import SENSOR, SETTINGS, STARTED_US, Ginnel, command, environment

from ginnel.cli import main
from ginnel.store import open_store, put_site, record_span
from ginnel.store.tables import PassageRow
from ginnel.words import US_PER_S, Site, Span

N_PASSAGES = 20_000
STATION = """
[sensor.station]
state = "36"
station = "4001"
functional_class = "7U"
approaching = 1
receding = 5
"""


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Settings and a log of so many passages, one a second."""
    place = tmp_path_factory.mktemp("export")
    (place / "ginnel.toml").write_text(SETTINGS + STATION, "utf-8")
    with open_store(f"sqlite:///{place / 'ginnel.db'}", create=True) as store:
        put_site(store, Site(name="Weir lane", timezone="Europe/Dublin"))
        span = Span(started_us=STARTED_US, ended_us=STARTED_US + N_PASSAGES * US_PER_S, sample_rate_hz=8000.0)
        record_span(store, SENSOR, span, [], "1")
        rows = [
            {
                "sensor_id": 1,
                "crossed_us": STARTED_US + n * US_PER_S,
                "started_us": STARTED_US + n * US_PER_S,
                "ended_us": STARTED_US + n * US_PER_S,
                "reading_id": 1,
                "story": 0,
                "direction": n % 3,
                "mover": None,
                "flags": 0,
                "speed_umps": 1_300_000,
            }
            for n in range(N_PASSAGES)
        ]
        with store.writing() as connection:
            connection.execute(insert(PassageRow), rows)
    return place


def visible(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir() if not path.name.startswith("ginnel.")}


@pytest.mark.parametrize("how", [signal.SIGINT, signal.SIGKILL])
def test_an_export_that_is_stopped_leaves_no_half_file(folder: Path, how: signal.Signals) -> None:
    """Whatever stops it, no file bears the name; what a kill leaves hidden goes with the next export."""
    name = f"{how.name}.xlsx"  # the slowest kind, so that there is time to stop it
    export = subprocess.Popen(
        command("export", "passages", "--format", "xlsx", "--output", name),
        cwd=folder,
        env=environment(),
        stderr=subprocess.DEVNULL,
    )
    with export:
        while not list(folder.glob(f".{name}.*.draft")):
            assert export.poll() is None
            time.sleep(0.01)
        export.send_signal(how)
    assert export.returncode != 0
    assert name not in visible(folder)
    if how is signal.SIGINT:
        assert list(folder.glob(f".{name}.*")) == []
    done = subprocess.run(
        command("export", "counts", "--format", "xlsx", "--output", name),
        cwd=folder,
        env=environment(),
        capture_output=True,
        text=True,
        check=True,
    )
    assert done.stderr == f"{name}: 18 rows\n"  # 6 hours, two ways and unknown
    assert list(folder.glob(f".{name}.*")) == []


@pytest.mark.parametrize("kind", ["csv", "parquet", "xlsx"])
def test_a_full_disk_is_one_clear_line_and_the_old_file_stays(folder: Path, kind: str) -> None:
    """A limit on the size of files stands for the full disk: the system refuses to write on."""
    path = folder / f"full.{kind}"
    path.write_text("the old one", "utf-8")

    def limit() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, 100_000))
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)

    done = subprocess.run(
        command("export", "passages", "--format", kind, "--output", path.name),
        cwd=folder,
        # a byte-code file cut short by the limit would break whoever imports it next
        env=environment() | {"PYTHONWARNINGS": "ignore", "PYTHONDONTWRITEBYTECODE": "1"},
        capture_output=True,
        text=True,
        preexec_fn=limit,
        check=False,
    )
    assert done.returncode == 1, done.stderr
    assert done.stderr.startswith("ginnel: ")
    assert len(done.stderr.splitlines()) == 1, done.stderr
    assert f"full.{kind} cannot be written: " in done.stderr
    assert path.read_text("utf-8") == "the old one"
    assert [left.name for left in folder.glob(f".full.{kind}*")] == []


@pytest.fixture
def here(folder: Path, monkeypatch: pytest.MonkeyPatch) -> Ginnel:
    monkeypatch.chdir(folder)
    for name in set(os.environ) - set(environment()):
        monkeypatch.delenv(name)
    return lambda *arguments: CliRunner().invoke(main, arguments, catch_exceptions=False)


def test_a_workbook_of_several_tables(here: Ginnel, folder: Path) -> None:
    done = here("export", "counts", "speeds", "occupancy", "--format", "xlsx", "--output", "all.xlsx")
    assert done.exit_code == 0, done.output
    book = openpyxl.load_workbook(folder / "all.xlsx", read_only=True)
    assert book.sheetnames == ["counts", "speeds", "occupancy", "about"]
    book.close()


def test_a_data_set_goes_into_a_new_folder_only(here: Ginnel, folder: Path) -> None:
    arguments = ("export", "passages", "--format", "parquet", "--partitioned", "--output", "parts")
    assert here(*arguments).stderr == f"parts: {N_PASSAGES} rows\n"
    assert [path.relative_to(folder).as_posix() for path in (folder / "parts").rglob("*.parquet")] == [
        "parts/sensor=lane/month=2026-03/part-0.parquet"
    ]
    again = here(*arguments)
    assert again.exit_code == 1
    assert again.stderr.endswith("is there already: give the name of a new folder\n")


def test_records_go_out_and_a_line_tells_what_is_in_none(here: Ginnel) -> None:
    done = here("export", "counts", "--format", "tmg")
    assert done.exit_code == 0
    assert {len(line) for line in done.stdout.splitlines()} == {143}
    assert done.stderr == "6667 passages of unknown direction are in no record\n"
    assert {len(line) for line in here("export", "speeds", "--format", "tmg").stdout.splitlines()} == {105}


def test_standard_output_is_the_file(here: Ginnel, folder: Path) -> None:
    assert here("export", "passages", "--output", "passages.csv").exit_code == 0
    done = here("export", "passages")
    assert done.stdout_bytes == (folder / "passages.csv").read_bytes()
    rows = list(csv.reader(done.stdout.splitlines()))
    assert len(rows) == N_PASSAGES + 1


def test_a_summary_of_what_was_asked_for(here: Ginnel, folder: Path) -> None:
    assert here("export", "summary", "--output", "page.html").exit_code == 0
    assert "20\N{NO-BREAK SPACE}000 (95 % limits" in (folder / "page.html").read_text("utf-8")


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (("counts", "speeds"), "several tables go together with --format xlsx only"),
        (("counts", "counts", "--format", "xlsx", "--output", "x"), "each table goes in once"),
        (("counts", "--format", "parquet"), "parquet needs --output FILE"),
        (
            ("counts", "--partitioned", "--format", "parquet", "--output", "x"),
            "--partitioned goes with passages",
        ),
        (("passages", "--format", "tmg"), "tmg has counts or speeds by the hour"),
        (("counts", "--format", "tmg", "--every", "day"), "tmg has counts or speeds by the hour"),
        (("counts", "--format", "pdf", "--output", "x"), "html and pdf are for a summary"),
        (("summary", "--format", "csv"), "a summary is html or pdf"),
    ],
)
def test_what_makes_no_sense_is_wrong_usage(here: Ginnel, arguments: tuple[str, ...], told: str) -> None:
    done = here("export", *arguments)
    assert done.exit_code == 2
    assert told in done.stderr


def test_help_has_an_example_that_works(here: Ginnel, folder: Path) -> None:
    text = here("export", "--help").stdout
    (example,) = [line.split()[1:] for line in text.splitlines() if line.startswith("    ginnel export")]
    assert here(*example).exit_code == 0
    assert (folder / "march.csv").is_file()
