"""Counts that others made, kept beside the log: series of counted intervals."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import delete, func, insert, select

from ginnel.errors import StoreError
from ginnel.store.codes import DIRECTION_CODES
from ginnel.store.engine import Store
from ginnel.store.tables import SeriesCountRow, SeriesRow
from ginnel.words import Direction

_ROWS_AT_ONCE = 10_000


@dataclass(frozen=True, slots=True, kw_only=True)
class SeriesCount:
    """How many were counted in one interval, [started_us, ended_us)."""

    started_us: int
    ended_us: int
    direction: Direction  # unknown: nobody told which way, or both together
    count: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Series:
    """A series in the store."""

    name: str
    source: str  # where it came from, as told when it was stored
    n_counts: int
    extent_us: tuple[int, int] | None


@dataclass(frozen=True, slots=True, kw_only=True)
class SeriesArrays:
    """Counts of one direction as columns, in order of time; arrays of shape (n,)."""

    started_us: NDArray[np.int64]
    ended_us: NDArray[np.int64]
    count: NDArray[np.int64]


def put_series(store: Store, name: str, source: str, counts: Iterable[SeriesCount]) -> int:
    """Store a series in place of one of that name, all or nothing; returns how many counts it has."""
    with store.writing() as connection:
        old = connection.execute(select(SeriesRow.id).where(SeriesRow.name == name)).scalar()
        if old is not None:
            connection.execute(delete(SeriesCountRow).where(SeriesCountRow.series_id == old))
            connection.execute(delete(SeriesRow).where(SeriesRow.id == old))
        made = connection.execute(insert(SeriesRow).values(name=name, source=source).returning(SeriesRow.id))
        series_id = made.scalar_one()
        rows = [
            {
                "series_id": series_id,
                "started_us": one.started_us,
                "direction": DIRECTION_CODES[one.direction],
                "ended_us": one.ended_us,
                "count": one.count,
            }
            for one in counts
        ]
        for at in range(0, len(rows), _ROWS_AT_ONCE):
            connection.execute(insert(SeriesCountRow), rows[at : at + _ROWS_AT_ONCE])
    return len(rows)


def all_series(store: Store) -> list[Series]:
    """Every series, by name."""
    query = (
        select(
            SeriesRow.name,
            SeriesRow.source,
            func.count(SeriesCountRow.started_us).label("n"),
            func.min(SeriesCountRow.started_us).label("first"),
            func.max(SeriesCountRow.ended_us).label("last"),
        )
        .join(SeriesCountRow, SeriesCountRow.series_id == SeriesRow.id, isouter=True)
        .group_by(SeriesRow.id, SeriesRow.name, SeriesRow.source)
        .order_by(SeriesRow.name)
    )
    with store.reading() as connection:
        return [
            Series(
                name=row.name,
                source=row.source,
                n_counts=row.n,
                extent_us=None if row.first is None else (row.first, row.last),
            )
            for row in connection.execute(query)
        ]


def series_arrays(store: Store, name: str, start_us: int, end_us: int) -> dict[Direction, SeriesArrays]:
    """Counts of a series by direction whose intervals share time with [start_us, end_us).

    Raises
    ------
    StoreError
        There is no such series.
    """
    with store.reading() as connection:
        known = connection.execute(select(SeriesRow.name, SeriesRow.id)).all()
        ids = {row.name: row.id for row in known}
        if name not in ids:
            raise StoreError(
                f"the store knows no series {name!r}; it knows: {', '.join(sorted(ids)) or 'none'}"
            )
        columns = (SeriesCountRow.started_us, SeriesCountRow.ended_us, SeriesCountRow.count)
        query = (
            select(SeriesCountRow.direction, *columns)
            .where(
                SeriesCountRow.series_id == ids[name],
                SeriesCountRow.ended_us > start_us,
                SeriesCountRow.started_us < end_us,
            )
            .order_by(SeriesCountRow.started_us)
        )
        rows = np.array([tuple(row) for row in connection.execute(query)], np.int64).reshape(-1, 4)
    found = {}
    for direction, code in DIRECTION_CODES.items():
        started, ended, count = rows[rows[:, 0] == code, 1:].T
        found[direction] = SeriesArrays(started_us=started, ended_us=ended, count=count)
    return found
