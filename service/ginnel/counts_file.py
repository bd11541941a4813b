"""Reading counts that others made: a CSV file of any columns, by a map that says which is which."""

from __future__ import annotations

import csv
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from pathlib import Path
from zoneinfo import ZoneInfo

from ginnel.errors import ImportFormatError
from ginnel.store import SeriesCount
from ginnel.times import to_us
from ginnel.words import US_PER_S, Direction


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnMap:
    """Which columns hold what."""

    time: str
    counts: tuple[tuple[str, Direction], ...]  # columns of counts, and the way that each counts
    direction: str | None = None  # column that says which way, in place of the ways above
    hour: str | None = None  # column of the hour, where the time column holds the day only


@dataclass(frozen=True, slots=True, kw_only=True)
class Label:
    """How a file calls the time of a line, and what it has counted then."""

    moment: datetime  # by the local clock, whether that ever showed it or not
    count: int | None  # all ways together; None: blank


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadCounts:
    """What a file holds, and what is wrong with it."""

    counts: tuple[SeriesCount, ...]
    problems: tuple[str, ...]  # one line each
    labels: tuple[Label, ...]  # of every line with a time by the local clock, in the file's order


def read_counts(path: Path, columns: ColumnMap, length_s: int, zone: ZoneInfo) -> ReadCounts:
    """Read a CSV file with a header. A blank count is none; a line that makes no sense is told and left out.

    Times without an offset are by the clock of the zone; where it shows an hour twice, the second that
    comes in the file is the later one. Where it skips an hour there is none.

    Raises
    ------
    ImportFormatError
        The file cannot be read, or lacks a column.
    """
    counts: dict[tuple[int, Direction], SeriesCount] = {}
    problems: list[str] = []
    labels: list[Label] = []
    try:
        with path.open(encoding="utf-8-sig", newline="") as stream:
            reader = csv.DictReader(stream)
            _check_header(path, reader.fieldnames or [], columns)
            for number, row in enumerate(reader, start=2):
                try:
                    labels += _label(row, columns)
                    for one in _counts_of(row, columns, length_s, zone, counts):
                        counts[one.started_us, one.direction] = one
                except ValueError as problem:
                    problems.append(f"{path} line {number}: {problem}")
    except UnicodeDecodeError as error:
        raise ImportFormatError(f"{path} is not UTF-8 text: save it as CSV UTF-8") from error
    except csv.Error as error:
        raise ImportFormatError(f"{path} is no CSV file: {error}") from error
    except OSError as error:
        raise ImportFormatError(f"{path} cannot be read: {error.strerror or error}") from error
    return ReadCounts(counts=tuple(counts.values()), problems=tuple(problems), labels=tuple(labels))


def _check_header(path: Path, header: Sequence[str], columns: ColumnMap) -> None:
    wanted = [columns.time, *(name for name, _ in columns.counts), columns.direction, columns.hour]
    missing = [name for name in wanted if name is not None and name not in header]
    if missing:
        raise ImportFormatError(f"{path} has no column {missing[0]!r}; it has: {', '.join(header) or 'none'}")


def _counts_of(
    row: dict[str, str | None],
    columns: ColumnMap,
    length_s: int,
    zone: ZoneInfo,
    known: dict[tuple[int, Direction], SeriesCount],
) -> Iterator[SeriesCount]:
    """Counts of one line, none where all are blank; ValueError says what makes no sense."""
    made = []
    for name, way in columns.counts:
        text = (row[name] or "").strip()
        if not text:
            continue
        direction = way if columns.direction is None else Direction((row[columns.direction] or "").strip())
        made.append((direction, _number(text)))
    if not made:
        return
    moments = _moments(row, columns, zone)
    free = [us for us in moments if all((us, direction) not in known for direction, _ in made)]
    if not free:
        raise ValueError(f"{(row[columns.time] or '').strip()} is there already")
    for direction, count in made:
        yield SeriesCount(
            started_us=free[0], ended_us=free[0] + length_s * US_PER_S, direction=direction, count=count
        )


def _number(text: str) -> int:
    number = float(text)
    if number < 0 or number != int(number) or number > 2**31 - 1:
        raise ValueError(f"{text!r} is no count")
    return int(number)


def _label(row: dict[str, str | None], columns: ColumnMap) -> list[Label]:
    """How a line is labelled, if by the local clock."""
    moment = _as_labelled(row, columns)
    texts = [text for name, _ in columns.counts if (text := (row[name] or "").strip())]
    count = sum(_number(text) for text in texts) if texts else None
    return [] if moment.tzinfo is not None else [Label(moment=moment, count=count)]


def _as_labelled(row: dict[str, str | None], columns: ColumnMap) -> datetime:
    moment = datetime.fromisoformat((row[columns.time] or "").strip())
    if columns.hour is not None:
        hour = (row[columns.hour] or "").strip().split(":")[0]
        moment += timedelta(hours=int(hour))
    return moment


def _moments(row: dict[str, str | None], columns: ColumnMap, zone: ZoneInfo) -> list[int]:
    """Moments that a line's time may be, the earlier first; two where the clock shows it twice."""
    moment = _as_labelled(row, columns)
    if moment.tzinfo is not None:
        return [to_us(moment)]
    both = [moment.replace(tzinfo=zone, fold=fold) for fold in (0, 1)]
    shown = [one for one in both if one.astimezone(UTC).astimezone(zone).replace(tzinfo=None) == moment]
    if not shown:
        raise ValueError(f"the clock of {zone} never showed {moment.isoformat(sep=' ')}")
    return sorted({to_us(one) for one in shown})
