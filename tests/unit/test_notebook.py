"""What `ginnel.open` gives, against the exported files and against arithmetic by hand."""

from __future__ import annotations

import io
import re
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import replace
from datetime import UTC, date, datetime
from pathlib import Path

import pandas as pd
import pytest

import ginnel
from ginnel.errors import ExportError, StoreError
from ginnel.export import TABLES, Question, iter_lines
from ginnel.notebook import Log
from ginnel.store import open_store, put_site, record_span
from ginnel.words import Direction, Flag, Passage, Sensor, Site, Span

S = 1_000_000
HOUR = 3600 * S
NINE = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
ONE = Passage(
    started_us=NINE,
    crossed_us=NINE + S,
    ended_us=NINE + 2 * S,
    direction=Direction.APPROACHING,
    direction_confidence=0.9,
    speed_mps=1.25,
    speed_se_mps=0.01,
    snr_db=12.0,
    flags=frozenset({Flag.CUT}),
)


@pytest.fixture(scope="module")
def file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("log") / "ginnel.db"
    with open_store(f"sqlite:///{path}", create=True) as store:
        put_site(store, Site(name="Tannery annex", timezone="Europe/Dublin"))
        for name in ("north", "south"):
            span = Span(started_us=NINE, ended_us=NINE + HOUR, sample_rate_hz=8000.0)
            later = replace(ONE, crossed_us=NINE + 60 * S, ended_us=NINE + 61 * S, speed_mps=None)
            record_span(store, Sensor(name=name), span, [ONE, later], "1")
            far = Span(started_us=NINE + 24 * HOUR, ended_us=NINE + 25 * HOUR, sample_rate_hz=8000.0)
            record_span(store, Sensor(name=name), far, [], "1")
    return path


@pytest.fixture
def log(file: Path) -> Iterator[Log]:
    with ginnel.open(file) as opened:
        yield opened


@pytest.mark.parametrize("name", TABLES)
def test_a_frame_says_what_the_file_says(file: Path, log: Log, name: str) -> None:
    with open_store(f"sqlite:///{file}", read_only=True) as store:
        text = b"".join(iter_lines(TABLES[name](store, Question())))
    read = pd.read_csv(io.BytesIO(text), keep_default_na=False, na_values=[""])
    frame: pd.DataFrame = getattr(log, name)()
    assert list(frame.columns) == list(read.columns)
    for column in read:
        if isinstance(frame[column].dtype, pd.DatetimeTZDtype):
            assert list(frame[column]) == [pd.Timestamp(text) for text in read[column]]
        else:
            pd.testing.assert_series_equal(
                frame[column].astype(object).where(frame[column].notna(), None),
                read[column].astype(object).where(read[column].notna(), None),
                check_dtype=False,
            )


def test_types_are_real(log: Log) -> None:
    passages, counts = log.passages(), log.counts()
    assert str(passages["crossed_at"].dtype) == "datetime64[us, UTC]"
    assert str(counts["interval_start"].dtype) == "datetime64[us, Europe/Dublin]"
    assert passages["direction"].dtype == "category"
    assert counts["count"].dtype == "Int64"
    assert pd.isna(counts["count"]).sum() == 2 * 2 * 23  # sensors, directions, hours that nobody listened
    assert pd.isna(passages["speed_mps"]).sum() == 2


@pytest.mark.parametrize(
    "since", ["2026-03-03", date(2026, 3, 3), "2026-03-03T00:00:00Z", datetime(2026, 3, 3, tzinfo=UTC)]
)
def test_since_may_be_given_in_many_ways(log: Log, since: str | date) -> None:
    counts = log.counts(since=since, sensor="north", every="day")
    assert len(counts) == 2
    assert counts["coverage"].tolist() == pytest.approx([1 / 24] * 2, abs=1e-6)


def test_sensors_and_time_can_be_chosen(log: Log) -> None:
    assert set(log.passages(sensor="north")["sensor"]) == {"north"}
    assert len(log.passages(sensor=["north", "south"])) == 4
    assert len(log.passages(until=datetime(2026, 3, 2, 9, 0, 30, tzinfo=UTC))) == 2
    assert len(log.passages(since="2026-03-04")) == 0
    assert len(log.speeds(sensor="north", every="month")) == 2


def test_what_cannot_be_opened_is_one_clear_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(StoreError, match=r"no store at .*nowhere\.db: give its file or database URL"):
        ginnel.open(tmp_path / "nowhere.db")
    monkeypatch.setitem(sys.modules, "pandas", None)
    with pytest.raises(ExportError, match=r"a data frame needs pandas: pip install pandas"):
        ginnel.open(tmp_path / "nowhere.db")


def test_a_notebook_cannot_change_the_log(log: Log) -> None:
    with pytest.raises(StoreError, match="open for reading only"), log._store.writing():
        pass


def test_importing_ginnel_imports_nothing_else() -> None:
    heavy = ("numpy", "pandas", "sqlalchemy")
    code = f"import sys, ginnel; print([name for name in {heavy} if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "[]\n"


def test_the_page_about_notebooks_works(file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    page = (Path(__file__).parents[2] / "docs/notebook.md").read_text("utf-8")
    monkeypatch.chdir(file.parent)
    names: dict[str, object] = {}
    blocks = re.findall(r"```python\n(.*?)```", page, re.DOTALL)
    code = "\n".join(blocks).replace('"lane"', '"north"')
    *_, last = code.strip().splitlines()
    exec(code.replace(last, f"answer = {last}"), names)
    answer = names["answer"]
    assert isinstance(answer, pd.DataFrame)
    # Monday 9 o'clock: two passages at each of two sensors; Tuesday 9 o'clock: none; so 1 on average
    assert answer.loc[9].to_dict() == {"approaching": 1.0, "receding": 0.0}
    log = names["log"]
    assert isinstance(log, Log)
    log.close()
