"""Passages as columns, for whoever reads millions of them: a few microseconds each, in constant memory."""

from __future__ import annotations

from collections.abc import Collection, Generator, Iterator, Sequence
from contextlib import ExitStack
from dataclasses import dataclass
from itertools import chain
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import func

from ginnel.store.codes import (
    DIRECTION_CODES,
    FLAG_BITS,
    MILLIONTHS,
    MOVER_CODES,
    STORY_CODES,
    THOUSANDTHS,
)
from ginnel.store.engine import Store
from ginnel.store.query import known_sensors, passage_query
from ginnel.store.tables import PassageRow
from ginnel.words import FloatArray, Story

ROWS_AT_ONCE = 4000
_NULL = -(2**31)  # below every measure and code of the table
_MEASURES = {
    "direction_confidence_ppm": MILLIONTHS,
    "speed_umps": MILLIONTHS,
    "speed_se_umps": MILLIONTHS,
    "snr_mdb": THOUSANDTHS,
}
_COLUMNS = ("crossed_us", "started_us", "ended_us", "story", "direction", "mover", "flags", *_MEASURES)
_N_FLAG_SETS = 2 * max(FLAG_BITS.values())


@dataclass(frozen=True, slots=True, kw_only=True)
class Coded:
    """A column of few different texts: which of the words each row has; the empty word is a blank."""

    codes: NDArray[np.int64]  # shape (n,)
    words: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class PassageColumns:
    """Some passages, turn-backs and fidgeting included if asked for; arrays of shape (n,)."""

    sensor: Coded
    crossed_us: NDArray[np.int64]
    started_us: NDArray[np.int64]
    ended_us: NDArray[np.int64]
    direction: Coded
    direction_confidence: FloatArray  # NaN where not measured, as with all measures
    speed_mps: FloatArray
    speed_se_mps: FloatArray
    snr_db: FloatArray
    mover: Coded
    flags: Coded  # parted by semicolons, a story that does not count before them


def iter_passage_columns(
    store: Store,
    sensor: str | Collection[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    *,
    with_uncounted: bool = False,
) -> Generator[PassageColumns]:
    """Passages as `iter_passages` gives them, in order of crossing, some thousands at a time."""
    columns = [
        func.coalesce(column, _NULL) if column.nullable else column
        for column in (PassageRow.__table__.c[name] for name in _COLUMNS)
    ]
    with store.reading() as connection, ExitStack() as stack:
        streams = []
        known = known_sensors(connection, sensor)
        for number, (sensor_id, _) in enumerate(known):
            query = passage_query(columns, sensor_id, start_us, end_us, with_uncounted)
            rows = connection.execution_options(yield_per=ROWS_AT_ONCE).execute(query)
            stack.callback(rows.close)
            streams.append(_numbered(rows, number))
        names = tuple(name for _, name in known)
        for table in _merged(streams):
            yield _columns(table, names)


def _numbered(rows: Any, number: int) -> Iterator[NDArray[np.int64]]:
    """Tables of whole numbers, one row a passage, with the sensor's number as the last column."""
    width = len(_COLUMNS)
    for part in rows.partitions():
        table = np.empty((len(part), width + 1), np.int64)
        table[:, :width] = np.fromiter(chain.from_iterable(part), np.int64, len(part) * width).reshape(
            -1, width
        )
        table[:, width] = number
        yield table


def _merged(streams: Sequence[Iterator[NDArray[np.int64]]]) -> Iterator[NDArray[np.int64]]:
    """Merge tables by their first column, in which each stream ascends; of equals the first stream's first.

    Whatever lies at or before the earliest end of all tables at hand is complete, and can go.
    """
    at_hand = {
        number: table for number, stream in enumerate(streams) if (table := next(stream, None)) is not None
    }
    while at_hand:
        last = min(int(table[-1, 0]) for table in at_hand.values())
        ready = []
        for number, table in list(at_hand.items()):
            n = int(np.searchsorted(table[:, 0], last, side="right"))
            ready.append(table[:n])
            rest = table[n:] if n < len(table) else next(streams[number], None)
            if rest is None:
                del at_hand[number]
            else:
                at_hand[number] = rest
        if len(ready) == 1:
            yield ready[0]
        else:
            table = np.concatenate(ready)
            yield table[np.argsort(table[:, 0], kind="stable")]


def _columns(table: NDArray[np.int64], names: tuple[str, ...]) -> PassageColumns:
    column = dict(zip((*_COLUMNS, "sensor"), table.T, strict=True))
    measured = {name: _measure(column[name], per_unit) for name, per_unit in _MEASURES.items()}
    return PassageColumns(
        sensor=Coded(codes=column["sensor"], words=names),
        crossed_us=column["crossed_us"],
        started_us=column["started_us"],
        ended_us=column["ended_us"],
        direction=Coded(codes=column["direction"], words=_DIRECTIONS),
        direction_confidence=measured["direction_confidence_ppm"],
        speed_mps=measured["speed_umps"],
        speed_se_mps=measured["speed_se_umps"],
        snr_db=measured["snr_mdb"],
        mover=Coded(codes=np.maximum(column["mover"], 0), words=_MOVERS),
        flags=Coded(codes=column["story"] * _N_FLAG_SETS + column["flags"], words=_FLAG_SETS),
    )


def _measure(values: NDArray[np.int64], per_unit: int) -> FloatArray:
    return np.where(values == _NULL, np.nan, values / per_unit)


def _flag_text(story: Story, bits: int) -> str:
    flags = [flag.value for flag, bit in FLAG_BITS.items() if bits & bit]
    return ";".join(flags if story is Story.PASSAGE else [story.value, *flags])


_DIRECTIONS = tuple(sorted(DIRECTION_CODES, key=lambda direction: DIRECTION_CODES[direction]))
_MOVERS = ("", *sorted(MOVER_CODES, key=lambda mover: MOVER_CODES[mover]))
_FLAG_SETS = tuple(
    _flag_text(story, bits)
    for story in sorted(STORY_CODES, key=lambda story: STORY_CODES[story])
    for bits in range(_N_FLAG_SETS)
)
