"""Writing the log while listening: a span that grows, and one that turns out to be of another date."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Iterator
from contextlib import closing, contextmanager

from sqlalchemy import delete, func, insert, select, update
from sqlalchemy.dialects import postgresql, sqlite

from ginnel.errors import SpanRefusedError, StoreBusyError
from ginnel.store.codes import PassageCodes
from ginnel.store.engine import Store
from ginnel.store.log import (
    SpanChange,
    of_span,
    overlap_text,
    overlapping,
    rows_of,
    stored_rows,
    taken_crossings,
    values,
)
from ginnel.store.readings import reading_row_id, sensor_row_id
from ginnel.store.stale import mark_stale
from ginnel.store.tables import PassageRow, SensorRow, SpanRow
from ginnel.words import Passage, Sensor, Span


def extend_span(
    store: Store,
    sensor: Sensor,
    span: Span,
    passages: Iterable[Passage],
    chain_version: str,
    *,
    drift_ppm: float | None = None,
    dropped_samples: int = 0,
) -> SpanChange:
    """Store how far live listening got, and the passages found since, in one transaction.

    The span is known by its start; its end only ever moves forward. Passages that are stored already
    stay as they are, so that a batch may safely be handed in twice.

    Parameters
    ----------
    drift_ppm : of the wall clock against the sample clock, as known by now; positive: samples come slow
    dropped_samples : lost just before the span, or within it where the source could not tell where

    Raises
    ------
    SpanRefusedError
        The span runs into another, or was begun under another reading. Nothing is changed.
    """
    rows = rows_of(sensor, span, passages)
    told = {"drift_ppm": drift_ppm, "dropped_samples": dropped_samples}
    with store.writing() as connection:
        sensor_id = sensor_row_id(connection, sensor)
        reading_id = reading_row_id(connection, sensor_id, sensor, chain_version)
        known = None
        for old in overlapping(connection, sensor_id, span):
            if old.started_us != span.started_us or old.reading_id != reading_id:
                raise SpanRefusedError(overlap_text(sensor, span, old))
            known = old
        if known is None:
            connection.execute(
                insert(SpanRow).values(
                    sensor_id=sensor_id,
                    reading_id=reading_id,
                    started_us=span.started_us,
                    ended_us=span.ended_us,
                    sample_rate_hz=span.sample_rate_hz,
                    clock_trusted=span.clock_trusted,
                    **told,
                )
            )
        elif known.ended_us < span.ended_us:
            grown = {"ended_us": span.ended_us, "clock_trusted": span.clock_trusted, **told}
            connection.execute(update(SpanRow).where(SpanRow.id == known.id).values(grown))
        grown_from_us = span.started_us if known is None else min(known.ended_us, span.ended_us)
        mark_stale(connection, sensor_id, grown_from_us, span.ended_us, [row.crossed_us for row in rows])
        if not rows:
            return SpanChange()
        added = len(rows) - len(taken_crossings(connection, sensor_id, rows))
        dialect = sqlite if store.dialect == "sqlite" else postgresql
        connection.execute(
            dialect.insert(PassageRow).on_conflict_do_nothing(), values(sensor_id, reading_id, rows)
        )
        return SpanChange(added=added, kept=len(rows) - added)


def redate_span(store: Store, sensor_name: str, started_us: int, new_started_us: int) -> bool:
    """Move a span and its passages to the time at which it really began; from now on it is trusted.

    False where there is no span of that start (any more), so that doing it twice does no harm.

    Raises
    ------
    SpanRefusedError
        It would run into another span. Nothing is changed.
    """
    by_us = new_started_us - started_us
    with store.writing() as connection:
        sensor_id = connection.execute(
            select(SensorRow.id).where(SensorRow.name == sensor_name).with_for_update()
        ).scalar()
        known = connection.execute(
            select(*SpanRow.__table__.columns).where(
                SpanRow.sensor_id == sensor_id, SpanRow.started_us == started_us
            )
        ).one_or_none()
        if sensor_id is None or known is None:
            return False
        old = Span(started_us=started_us, ended_us=known.ended_us, sample_rate_hz=known.sample_rate_hz)
        new = Span(
            started_us=new_started_us, ended_us=known.ended_us + by_us, sample_rate_hz=known.sample_rate_hz
        )
        for other in overlapping(connection, sensor_id, new):
            if other.id == known.id:
                continue
            if other.started_us == new.started_us and other.redated_by_us == by_us:
                # it was moved before, then stored under its old date once more
                connection.execute(delete(SpanRow).where(SpanRow.id == known.id))
                connection.execute(delete(PassageRow).where(*of_span(sensor_id, old)))
                return True
            raise SpanRefusedError(overlap_text(Sensor(name=sensor_name), new, other))
        n_codes = len(PassageCodes._fields)
        rows = stored_rows(connection, sensor_id, old)
        moved = [
            {**_moved(row[:n_codes], by_us), "sensor_id": sensor_id, "reading_id": row[n_codes]}
            for row in rows
        ]
        crossings_us = [row[0] for row in rows if row[0] is not None]
        mark_stale(connection, sensor_id, old.started_us, old.ended_us, crossings_us)
        crossings_us = [crossed_us + by_us for crossed_us in crossings_us]
        mark_stale(connection, sensor_id, new.started_us, new.ended_us, crossings_us)
        connection.execute(delete(PassageRow).where(*of_span(sensor_id, old)))
        connection.execute(
            update(SpanRow)
            .where(SpanRow.id == known.id)
            .values(started_us=new.started_us, ended_us=new.ended_us, clock_trusted=True, redated_by_us=by_us)
        )
        if moved:
            connection.execute(insert(PassageRow), moved)
        return True


def listened_until_us(store: Store, sensor_name: str) -> int | None:
    """End of a sensor's last span whose date can be trusted; None where it has none."""
    with store.reading() as connection:
        return connection.execute(
            select(func.max(SpanRow.ended_us))
            .join(SensorRow, SensorRow.id == SpanRow.sensor_id)
            .where(SensorRow.name == sensor_name, SpanRow.clock_trusted)
        ).scalar()


@contextmanager
def kept_open(store: Store) -> Iterator[None]:
    """Keep a SQLite store in use for as long as this lasts; another one needs no such thing.

    When its last user leaves, SQLite copies its write-ahead log into the file. Whoever writes a little every
    minute would so write all of it twice, which wears a flash card.
    """
    if store.dialect != "sqlite":
        yield
        return
    with closing(sqlite3.connect(store.name, check_same_thread=False)) as connection:
        try:
            # only now it is a user; no transaction stays open
            connection.execute("SELECT count(*) FROM sqlite_master").fetchone()
        except sqlite3.Error as exc:
            raise StoreBusyError(f"{store.name}: {exc}") from exc
        yield


def _moved(codes: tuple[int | None, ...], by_us: int) -> dict[str, int | None]:
    """One passage's columns, its three times moved."""
    row = PassageCodes(*codes)  # type: ignore[arg-type] # as the table gave them
    return row._replace(
        crossed_us=row.crossed_us + by_us,
        started_us=row.started_us + by_us,
        ended_us=row.ended_us + by_us,
    )._asdict()
