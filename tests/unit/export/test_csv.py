"""What is in the files: columns and cells as the contract has them, RFC 4180 and RFC 3339."""

from __future__ import annotations

import csv
import io
import json
import re
from dataclasses import replace
from datetime import UTC, datetime

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.errors import StoreError
from ginnel.export import TABLES, Question, iter_lines
from ginnel.export.cells import Numbered, coded, moments, numbers
from ginnel.export.columns import Column, Kind
from ginnel.export.lines import csv_lines, json_lines, safe_text
from ginnel.reports import Every
from ginnel.store import LoggedHealth, Store, put_health, record_span
from ginnel.times import to_us
from ginnel.words import Direction, Flag, HealthSample, MoverKind, Passage, Sensor, Span, Story

S = 1_000_000
HOUR = 3600 * S
NINE = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
NORTH = Sensor(name="north", speed_bands_mps=(1.0, 2.0))

# The contract, as the design page has it.
PASSAGES = (
    "passage_id,sensor,started_at,crossed_at,ended_at,direction,direction_confidence,"
    "speed_mps,speed_se_mps,speed_band,snr_db,mover,flags"
)
COUNTS = (
    "sensor,interval_start,interval_end,direction,count,count_low,count_high,corrected,coverage,listened_s"
)
SPEEDS = (
    "sensor,interval_start,interval_end,direction,"
    "n,mean_mps,space_mean_mps,sd_mps,p15_mps,p50_mps,p85_mps,p95_mps"
)

HEALTH = (
    "sensor,measured_at,listened_s,level_dbfs,noise_dbfs_hz,hum_db,lamp_db,lamp_mps,clipped_share,dropped_samples,"
    "lag_s,disk_free_bytes,disk_size_bytes,resident_bytes,temperature_c"
)

FULL = Passage(
    started_us=NINE + 1 * S,
    crossed_us=NINE + 4 * S + 123_456,
    ended_us=NINE + 5 * S,
    direction=Direction.APPROACHING,
    direction_confidence=0.98765,
    speed_mps=1.34,
    speed_se_mps=0.0123,
    snr_db=-3.25,
    mover=MoverKind.ON_FOOT,
    flags=frozenset({Flag.OVERLAPPING, Flag.CLIPPED}),
)
BARE = Passage(
    started_us=NINE + 10 * S,
    crossed_us=NINE + 10 * S,
    ended_us=NINE + 10 * S,
    direction=Direction.UNKNOWN,
    direction_confidence=None,
    speed_mps=None,
    speed_se_mps=None,
    snr_db=None,
)


def span(start_us: int, end_us: int) -> Span:
    return Span(started_us=start_us, ended_us=end_us, sample_rate_hz=8000.0)


@pytest.fixture
def filled(store: Store) -> Store:
    turned = replace(BARE, crossed_us=NINE + 20 * S, ended_us=NINE + 20 * S, story=Story.TURN_BACK)
    record_span(store, NORTH, span(NINE, NINE + HOUR // 2), [FULL, BARE, turned], "1")
    record_span(store, NORTH, span(NINE + 2 * HOUR, NINE + 3 * HOUR), [], "1")
    sample = HealthSample(at_us=NINE + 60 * S, listened_s=60.0, level_dbfs=-20.5, disk_free_bytes=3_000_000)
    put_health(store, [LoggedHealth(sensor="north", sample=sample)])
    return store


def text_of(name: str, store: Store, asked: Question | None = None) -> str:
    return b"".join(iter_lines(TABLES[name](store, asked or Question()))).decode()


def test_passages_as_the_contract_has_them(filled: Store) -> None:
    lines = text_of("passages", filled).split("\r\n")
    assert lines == [
        PASSAGES,
        f"north-{NINE + 4 * S + 123_456},north,2026-03-02T09:00:01.000000Z,2026-03-02T09:00:04.123456Z,"
        "2026-03-02T09:00:05.000000Z,approaching,0.9877,1.3400,0.0123,1-2,-3.25,on foot,clipped;overlapping",
        f"north-{NINE + 10 * S},north,2026-03-02T09:00:10.000000Z,2026-03-02T09:00:10.000000Z,"
        "2026-03-02T09:00:10.000000Z,unknown,,,,,,,",
        "",
    ]


def test_what_does_not_count_says_so_among_its_flags(filled: Store) -> None:
    rows = list(csv.DictReader(io.StringIO(text_of("passages", filled, Question(with_uncounted=True)))))
    assert [row["flags"] for row in rows] == ["clipped;overlapping", "", "turn-back"]


def test_counts_as_the_contract_has_them(filled: Store) -> None:
    lines = text_of("counts", filled).split("\r\n")
    hour = "2026-03-02T09:00:00+00:00,2026-03-02T10:00:00+00:00"
    assert lines[:4] == [
        COUNTS,
        f"north,{hour},approaching,1,0.0253,5.5716,,0.500000,1800.000000",
        f"north,{hour},receding,0,0.0000,3.6889,,0.500000,1800.000000",
        f"north,{hour},unknown,1,0.0253,5.5716,,0.500000,1800.000000",
    ]
    # never listened to: blank, not zero
    assert (
        lines[4]
        == "north,2026-03-02T10:00:00+00:00,2026-03-02T11:00:00+00:00,approaching,,,,,0.000000,0.000000"
    )
    assert lines[7].endswith(",approaching,0,0.0000,3.6889,,1.000000,3600.000000")


def test_speeds_as_the_contract_has_them(filled: Store) -> None:
    lines = text_of("speeds", filled).split("\r\n")
    hour = "2026-03-02T09:00:00+00:00,2026-03-02T10:00:00+00:00"
    assert lines[:4] == [
        f"{SPEEDS},band_<1,band_1-2,band_>=2",
        f"north,{hour},approaching,1,1.3400,1.3400,,1.3400,1.3400,1.3400,1.3400,0,1,0",
        f"north,{hour},receding,0,,,,,,,,0,0,0",
        f"north,{hour},unknown,0,,,,,,,,0,0,0",
    ]
    assert lines[4].endswith("T11:00:00+00:00,approaching" + "," * 11)


def test_occupancy_and_health_as_the_reference_has_them(filled: Store) -> None:
    # FULL is heard from 1 s to 5 s, BARE and who turned back for no time at all: 4 s of half an hour
    assert text_of("occupancy", filled).split("\r\n")[:3] == [
        "sensor,interval_start,interval_end,occupied_s,occupancy,coverage,listened_s",
        "north,2026-03-02T09:00:00+00:00,2026-03-02T10:00:00+00:00,14.000000,0.007778,0.500000,1800.000000",
        "north,2026-03-02T10:00:00+00:00,2026-03-02T11:00:00+00:00,,,0.000000,0.000000",
    ]
    assert text_of("health", filled).split("\r\n") == [
        HEALTH,
        "north,2026-03-02T09:01:00.000000Z,60.000,-20.500,,,,,,0,,3000000,,,",
        "",
    ]


def test_speed_bands_of_several_sensors_get_a_column_each(filled: Store) -> None:
    south = Sensor(name="south", speed_bands_mps=(1.0, 1.5, 2.0))
    moment = replace(FULL, speed_mps=1.75)
    record_span(filled, south, span(NINE, NINE + HOUR), [moment], "1")
    rows = list(csv.reader(io.StringIO(text_of("speeds", filled))))
    assert rows[0][12:] == ["band_<1", "band_1-1.5", "band_1-2", "band_1.5-2", "band_>=2"]
    north, south_row = rows[1], next(row for row in rows if row[0] == "south")
    assert north[12:] == ["0", "", "1", "", "0"]
    assert south_row[12:] == ["0", "0", "", "1", "0"]


def test_every_line_has_as_many_cells_as_the_header_and_ends_in_crlf(filled: Store) -> None:
    for name in TABLES:
        text = text_of(name, filled)
        assert text.endswith("\r\n")
        assert "\n" not in text.replace("\r\n", "")
        rows = list(csv.reader(io.StringIO(text)))
        assert {len(row) for row in rows} == {len(rows[0])}


def test_times_are_rfc_3339(filled: Store) -> None:
    form = re.compile(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d+)?(Z|[+-]\d\d:\d\d)")  # section 5.6
    for name, columns in (("passages", (2, 3, 4)), ("counts", (1, 2)), ("speeds", (1, 2)), ("health", (1,))):
        rows = list(csv.reader(io.StringIO(text_of(name, filled))))[1:]
        assert rows
        assert all(form.fullmatch(row[column]) for row in rows for column in columns)


def test_intervals_carry_the_offset_of_their_own_moment(store: Store) -> None:
    # Dublin, the night of 29 March 2026: 01:00 UTC is 02:00 summer time
    one = 1_774_746_000 * S
    record_span(store, NORTH, span(one - HOUR, one + HOUR), [], "1")
    rows = list(csv.reader(io.StringIO(text_of("counts", store))))[1:]
    assert [row[1:3] for row in rows[::2]] == [
        ["2026-03-29T00:00:00+00:00", "2026-03-29T02:00:00+01:00"],
        ["2026-03-29T02:00:00+01:00", "2026-03-29T03:00:00+01:00"],
    ]


@pytest.mark.parametrize("every", list(Every))
def test_counts_of_every_length_hold_all_passages(filled: Store, every: Every) -> None:
    rows = csv.DictReader(io.StringIO(text_of("counts", filled, Question(every=every))))
    assert sum(int(row["count"] or 0) for row in rows) == 2


def test_an_empty_log_is_a_header(store: Store) -> None:
    assert text_of("passages", store) == PASSAGES + "\r\n"
    assert text_of("counts", store) == COUNTS + "\r\n"
    assert text_of("speeds", store) == SPEEDS + "\r\n"
    assert text_of("health", store) == HEALTH + "\r\n"


def test_period_and_sensor_can_be_chosen(filled: Store) -> None:
    record_span(filled, replace(NORTH, name="south"), span(NINE, NINE + HOUR), [FULL], "1")
    text = text_of("passages", filled, Question(sensors=("south",), start_us=NINE, end_us=NINE + 5 * S))
    assert [row["sensor"] for row in csv.DictReader(io.StringIO(text))] == ["south"]
    text = text_of("passages", filled, Question(start_us=NINE + 5 * S, end_us=NINE + HOUR))
    assert [row["direction"] for row in csv.DictReader(io.StringIO(text))] == ["unknown"]


def test_an_unknown_sensor_is_refused_before_anything_is_written(filled: Store) -> None:
    for table in TABLES.values():
        with pytest.raises(StoreError, match="no sensor 'west'; it knows: north"):
            table(filled, Question(sensors=("west",)))


def test_no_text_is_taken_for_a_formula(store: Store) -> None:
    # OWASP's list of characters with which a formula may begin: = + - @ tab return
    nasty = replace(NORTH, name='=HYPERLINK("x"),1')
    record_span(store, nasty, span(NINE, NINE + HOUR), [FULL], "1")
    (row,) = csv.DictReader(io.StringIO(text_of("passages", store)))
    assert row["sensor"] == '\'=HYPERLINK("x"),1'
    assert row["passage_id"].startswith("'=")
    assert row["snr_db"] == "-3.25"  # a number stays a number
    for begin in "=+-@\t\r":
        assert safe_text(f"{begin}x") == f"'{begin}x"
    assert safe_text("north-1") == "north-1"


def test_numbers_are_plain() -> None:
    def text(value: float | None, decimals: int) -> str:
        column = Column(name="x", kind=Kind.NUMBER, description="", decimals=decimals)
        return csv_lines([column], (numbers([value]),), UTC).decode().removesuffix("\r\n")

    assert text(None, 2) == ""
    assert text(-0.0001, 2) == "0.00"
    assert text(-3.256, 2) == "-3.26"
    assert text(1e9, 1) == "1000000000.0"
    assert text(12.0, 0) == "12"


@given(
    rows=st.lists(
        st.tuples(
            st.text(st.characters(exclude_characters="\0", exclude_categories=["Cs"]), max_size=5),
            st.none() | st.floats(-1e9, 1e9).map(lambda x: round(x, 4)),
            st.datetimes(datetime(1970, 1, 1), datetime(2199, 1, 1)),  # noqa: DTZ001 (hypothesis wants naive)
        ),
        min_size=1,
    )
)
def test_any_cells_read_back_as_they_were(rows: list[tuple[str, float | None, datetime]]) -> None:
    """Python's own csv, json and datetime are the judges."""
    columns = [
        Column(name="text", kind=Kind.TEXT, description=""),
        Column(name="id", kind=Kind.TEXT, description=""),
        Column(name="number", kind=Kind.NUMBER, description="", decimals=4),
        Column(name="moment", kind=Kind.MOMENT, description=""),
    ]
    texts, values = [text for text, _, _ in rows], [value for _, value, _ in rows]
    stamps = [to_us(time.replace(tzinfo=UTC)) for _, _, time in rows]
    word = coded(texts)
    batch = (word, Numbered(word=word, number=np.array(stamps)), numbers(values), moments(stamps))

    read = list(csv.reader(io.StringIO(csv_lines(columns, batch, UTC).decode(), newline="")))
    assert [row[0] for row in read] == [safe_text(text) for text in texts]
    assert [row[1] for row in read] == [safe_text(f"{t}-{us}") for t, us in zip(texts, stamps, strict=True)]
    assert [float(row[2]) if row[2] else None for row in read] == pytest.approx(values, abs=1e-4)
    assert [to_us(datetime.fromisoformat(row[3])) for row in read] == stamps

    objects = [json.loads(line) for line in json_lines(columns, batch, UTC).decode().split("\n")[:-1]]
    assert [one["text"] for one in objects] == [text or None for text in texts]
    assert [one["id"] for one in objects] == [f"{t}-{us}" for t, us in zip(texts, stamps, strict=True)]
    assert [one["number"] for one in objects] == pytest.approx(values, abs=1e-4)
    assert [to_us(datetime.fromisoformat(one["moment"])) for one in objects] == stamps


def test_passages_of_several_sensors_come_in_order_of_crossing(store: Store) -> None:
    """More of them than are read at once, and some at the same moment."""
    rng = np.random.default_rng(5)
    wanted = []
    for number, name in enumerate(("a", "b", "c")):
        times = NINE + np.sort(rng.choice(40_000, 9_000, replace=False)) * 1000
        wanted += [(int(us), f"{name}-{us}") for us in times]
        passages = [replace(FULL, started_us=us, crossed_us=us, ended_us=us) for us in times.tolist()]
        record_span(store, Sensor(name=name), span(NINE, NINE + HOUR), passages, str(number))
    rows = csv.DictReader(io.StringIO(text_of("passages", store)))
    assert [row["passage_id"] for row in rows] == [name for _, name in sorted(wanted)]
