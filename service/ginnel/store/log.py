"""Writing the log: spans with their passages, one transaction each."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Any

from sqlalchemy import Connection, Row, delete, insert, select, update

from ginnel.errors import SpanRefusedError
from ginnel.store.codes import PassageCodes, encode
from ginnel.store.engine import Store
from ginnel.store.readings import mounting_row_id, reading_row_id, sensor_row_id
from ginnel.store.stale import mark_stale
from ginnel.store.tables import PassageRow, SiteRow, SpanRow
from ginnel.times import utc_text
from ginnel.words import US_PER_S, Passage, Sensor, Site, Span

#: A crossing may lie this far outside the time in which its mover was heard, and no further.
CROSSING_MARGIN_US = 600 * US_PER_S
#: Times of hearing that stick out of their span by less than this are rounding, and are cut to it.
ROUNDING_US = US_PER_S


@dataclass(frozen=True, slots=True, kw_only=True)
class SpanChange:
    """What recording a span did to the passages of the log."""

    added: int = 0
    removed: int = 0
    kept: int = 0
    already_stored: bool = False  # nothing was changed: all of it was there

    def __str__(self) -> str:
        """Say it in a few words."""
        if self.already_stored:
            return f"already stored ({self.kept} kept)"
        return f"{self.added} added, {self.removed} removed, {self.kept} kept"


def put_site(store: Store, site: Site) -> None:
    """Set the site's name and time zone."""
    with store.writing() as connection:
        values = {"name": site.name, "timezone": site.timezone}
        if connection.execute(update(SiteRow).values(values)).rowcount == 0:
            connection.execute(insert(SiteRow).values(id=1, **values))


def put_sensor(store: Store, sensor: Sensor) -> None:
    """Set a sensor's settings and make its mounting known."""
    with store.writing() as connection:
        mounting_row_id(connection, sensor_row_id(connection, sensor), sensor.mounting)


def record_span(
    store: Store, sensor: Sensor, span: Span, passages: Iterable[Passage], chain_version: str
) -> SpanChange:
    """Store a whole span and its passages in one transaction.

    A span is *read* by a version of the chain, for a mounting, under settings. Against what is stored:

    - the same span with the same reading and passages: nothing changes;
    - a span within a longer one of the same reading: nothing changes;
    - a span that covers stored spans, each of them wholly: replaces them and their passages, whatever
      their reading;
    - any other overlap: refused, since one or the other would lose time that was listened to.

    Raises
    ------
    SpanRefusedError
        A partial overlap, or a passage that does not lie in the span. Nothing is changed.
    """
    rows = rows_of(sensor, span, passages)
    with store.writing() as connection:
        sensor_id = sensor_row_id(connection, sensor)
        reading_id = reading_row_id(connection, sensor_id, sensor, chain_version)
        found = overlapping(connection, sensor_id, span)
        for old in found:
            longer = old.started_us <= span.started_us and span.ended_us <= old.ended_us
            same = (old.started_us, old.ended_us) == (span.started_us, span.ended_us)
            if longer and not same and old.reading_id == reading_id:
                return SpanChange(kept=len(stored_rows(connection, sensor_id, span)), already_stored=True)
            if not (span.started_us <= old.started_us and old.ended_us <= span.ended_us):
                raise SpanRefusedError(overlap_text(sensor, span, old))

        stored = stored_rows(connection, sensor_id, span)
        new = {(*row, reading_id) for row in rows}
        kept = len(stored & new)
        change = SpanChange(added=len(new) - kept, removed=len(stored) - kept, kept=kept)
        if len(found) == 1 and stored == new and _is_row_of(found[0], span, reading_id):
            return replace(change, already_stored=True)

        # a span that covers others covers their time too; their crossings may lie just outside it
        crossings_us = [row[0] for row in stored | new if row[0] is not None]
        mark_stale(connection, sensor_id, span.started_us, span.ended_us, crossings_us)
        if found:
            connection.execute(delete(SpanRow).where(SpanRow.id.in_([old.id for old in found])))
            connection.execute(delete(PassageRow).where(*of_span(sensor_id, span)))
        connection.execute(
            insert(SpanRow).values(
                sensor_id=sensor_id,
                reading_id=reading_id,
                started_us=span.started_us,
                ended_us=span.ended_us,
                sample_rate_hz=span.sample_rate_hz,
                clock_trusted=span.clock_trusted,
            )
        )
        if rows:
            # A crossing just outside its span may, hardly ever, hit the microsecond of a neighbour's.
            for crossed_us in taken_crossings(connection, sensor_id, rows):
                raise SpanRefusedError(
                    f"{sensor.name} has a passage crossing at {utc_text(crossed_us)} in a neighbouring span: "
                    "replay the captures of both together"
                )
            connection.execute(insert(PassageRow), values(sensor_id, reading_id, rows))
        return change


def rows_of(sensor: Sensor, span: Span, passages: Iterable[Passage]) -> list[PassageCodes]:
    """Rows in order of crossing, each crossing its own; refuses what does not lie in the span."""
    if span.ended_us < span.started_us:
        raise SpanRefusedError(
            f"a span of {sensor.name} ends before it starts, at {utc_text(span.started_us)}"
        )
    rows: list[PassageCodes] = []
    for row in sorted((encode(passage) for passage in passages), key=_order):
        outside_us = max(span.started_us - row.started_us, row.ended_us - span.ended_us, 0)
        astray_us = max(row.started_us - row.crossed_us, row.crossed_us - row.ended_us, 0)
        if outside_us > ROUNDING_US or astray_us > CROSSING_MARGIN_US or row.ended_us < row.started_us:
            raise SpanRefusedError(
                f"the passage of {sensor.name} crossing at {utc_text(row.crossed_us)} does not lie in "
                f"the span from {utc_text(span.started_us)} to {utc_text(span.ended_us)}"
            )
        started_us = min(max(row.started_us, span.started_us), max(span.ended_us - 1, span.started_us))
        row = row._replace(started_us=started_us, ended_us=max(min(row.ended_us, span.ended_us), started_us))
        if rows and row.crossed_us <= rows[-1].crossed_us:
            # Two movers at one instant: a microsecond, far below a sample, keeps both.
            row = row._replace(crossed_us=rows[-1].crossed_us + 1)
        rows.append(row)
    return rows


def _order(row: PassageCodes) -> tuple[int, ...]:
    return tuple(-1 if value is None else value for value in row)


def values(sensor_id: int, reading_id: int, rows: Sequence[PassageCodes]) -> list[dict[str, Any]]:
    """Rows as the passage table takes them."""
    return [{"sensor_id": sensor_id, "reading_id": reading_id, **row._asdict()} for row in rows]


def overlapping(connection: Connection, sensor_id: int, span: Span) -> Sequence[Row[Any]]:
    """Find stored spans that share time, or their start, with a span."""
    return connection.execute(
        select(*SpanRow.__table__.columns)
        .where(
            SpanRow.sensor_id == sensor_id,
            (SpanRow.started_us < span.ended_us) & (SpanRow.ended_us > span.started_us)
            | (SpanRow.started_us == span.started_us),
        )
        .order_by(SpanRow.started_us)
    ).all()


def of_span(sensor_id: int, span: Span) -> tuple[Any, ...]:
    """Conditions for the passages of a span; the bounds of the crossing let the key find them."""
    return (
        PassageRow.sensor_id == sensor_id,
        PassageRow.crossed_us >= span.started_us - CROSSING_MARGIN_US,
        PassageRow.crossed_us <= span.ended_us + CROSSING_MARGIN_US,
        PassageRow.started_us >= span.started_us,
        PassageRow.started_us < max(span.ended_us, span.started_us + 1),
    )


def stored_rows(connection: Connection, sensor_id: int, span: Span) -> set[tuple[int | None, ...]]:
    """Rows of a span as they are stored, each with its reading."""
    columns = [getattr(PassageRow, name) for name in (*PassageCodes._fields, "reading_id")]
    return {tuple(row) for row in connection.execute(select(*columns).where(*of_span(sensor_id, span)))}


def _is_row_of(row: Row[Any], span: Span, reading_id: int) -> bool:
    return (row.started_us, row.ended_us, row.sample_rate_hz, row.clock_trusted, row.reading_id) == (
        span.started_us,
        span.ended_us,
        span.sample_rate_hz,
        span.clock_trusted,
        reading_id,
    )


def taken_crossings(connection: Connection, sensor_id: int, rows: Sequence[PassageCodes]) -> list[int]:
    """Find crossings of these rows that the log holds already."""
    crossings = {row.crossed_us for row in rows}
    near = connection.execute(
        select(PassageRow.crossed_us).where(
            PassageRow.sensor_id == sensor_id,
            PassageRow.crossed_us.between(min(crossings), max(crossings)),
        )
    ).scalars()
    return sorted(crossings.intersection(near))


def overlap_text(sensor: Sensor, span: Span, old: Row[Any]) -> str:
    """Say that a span overlaps a stored one."""
    return (
        f"{sensor.name}: {utc_text(span.started_us)} to {utc_text(span.ended_us)} overlaps a part of what "
        f"is stored, {utc_text(old.started_us)} to {utc_text(old.ended_us)}: "
        "replay all captures of that time together"
    )
