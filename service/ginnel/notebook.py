"""The log as pandas data frames: what ``ginnel.open`` gives.

The same tables, columns and rounding as the exported files, with real types: texts that repeat are
categories, moments carry their zone, blanks are missing values.
"""

from __future__ import annotations

from collections.abc import Iterable
from datetime import UTC, date, datetime
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Any, Self

import numpy as np

from ginnel.errors import StoreError
from ginnel.export import TABLES, Kind, Question, Table
from ginnel.export.cells import Cells, Numbered, rounded
from ginnel.export.columns import Column
from ginnel.export.libraries import optional
from ginnel.reports import Every, zone
from ginnel.store import Coded, Store, open_store
from ginnel.times import to_us

if TYPE_CHECKING:
    import pandas as pd

#: A moment or a day; without an offset it is the site's own time.
When = str | date | datetime | None


class Log:
    """A log that is open for reading. Close it when done, or use it in a ``with`` statement."""

    def __init__(self, store: Store) -> None:
        self._store = store

    def passages(
        self,
        since: When = None,
        until: When = None,
        sensor: str | Iterable[str] | None = None,
        *,
        uncounted: bool = False,
    ) -> pd.DataFrame:
        """Passages that cross in [since, until); turn-backs and fidgeting too if asked for."""
        return self._frame("passages", since, until, sensor, uncounted=uncounted)

    def counts(
        self,
        since: When = None,
        until: When = None,
        sensor: str | Iterable[str] | None = None,
        every: str = "hour",
    ) -> pd.DataFrame:
        """Counts by interval and direction; intervals as in ``ginnel export``."""
        return self._frame("counts", since, until, sensor, every)

    def speeds(
        self,
        since: When = None,
        until: When = None,
        sensor: str | Iterable[str] | None = None,
        every: str = "hour",
    ) -> pd.DataFrame:
        """Speeds by interval and direction."""
        return self._frame("speeds", since, until, sensor, every)

    def occupancy(
        self,
        since: When = None,
        until: When = None,
        sensor: str | Iterable[str] | None = None,
        every: str = "hour",
    ) -> pd.DataFrame:
        """Share of the time in which somebody was in the beam, by interval."""
        return self._frame("occupancy", since, until, sensor, every)

    def health(
        self, since: When = None, until: When = None, sensor: str | Iterable[str] | None = None
    ) -> pd.DataFrame:
        """How well the sensors heard, minute by minute."""
        return self._frame("health", since, until, sensor)

    def close(self) -> None:
        """Let go of the store; harmless when repeated."""
        self._store.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def _frame(
        self,
        name: str,
        since: When,
        until: When,
        sensor: str | Iterable[str] | None,
        every: str = "hour",
        *,
        uncounted: bool = False,
    ) -> pd.DataFrame:
        asked = Question(
            sensors=(sensor,) if isinstance(sensor, str) else None if sensor is None else tuple(sensor),
            start_us=self._moment_us(since),
            end_us=self._moment_us(until),
            every=Every(every),
            with_uncounted=uncounted,
        )
        return frame(TABLES[name](self._store, asked))

    def _moment_us(self, when: When) -> int | None:
        if when is None:
            return None
        moment = datetime.fromisoformat(when) if isinstance(when, str) else when
        if not isinstance(moment, datetime):
            moment = datetime(moment.year, moment.month, moment.day)  # noqa: DTZ001 (the zone comes next)
        return to_us(moment if moment.tzinfo is not None else moment.replace(tzinfo=zone(self._store)))


def open_log(where: str | Path) -> Log:
    """Open the log at a database URL, or the SQLite file of that name, for reading.

    Raises
    ------
    StoreError
        There is no log of this version.
    ExportError
        pandas is not installed; the message says how to get it.
    """
    optional("pandas", "pandas", "a data frame")
    text = str(where)
    if "://" not in text and not Path(text).is_file():
        raise StoreError(f"there is no store at {text}: give its file or database URL")
    return Log(open_store(text if "://" in text else f"sqlite:///{text}", read_only=True))


def frame(table: Table) -> pd.DataFrame:
    """Make a data frame of a table; it is all in memory, about 120 bytes a passage."""
    pandas = optional("pandas", "pandas", "a data frame")
    pieces = list(table.batches)
    series = {}
    for at, column in enumerate(table.columns):
        cells = [piece[at] for piece in pieces]
        series[column.name] = _series(pandas, column, cells, str(table.zone))
    return pandas.DataFrame(series)


def _series(pandas: Any, column: Column, pieces: list[Cells], zone_name: str) -> Any:
    if column.kind is Kind.MOMENT:
        moments = np.concatenate([_array(piece) for piece in pieces] or [np.empty(0, "datetime64[us]")])
        series = pandas.Series(moments).dt.tz_localize(UTC)
        return series.dt.tz_convert(zone_name) if column.local else series
    if column.kind is Kind.TEXT:
        texts = [_text(pandas, piece) for piece in pieces]
        if not texts:
            return pandas.Series([], dtype="category")
        if isinstance(pieces[0], Numbered):
            return pandas.concat(texts, ignore_index=True)
        union = pandas.api.types.union_categoricals
        joined = union([one.array for one in texts])
        return pandas.Series(joined.remove_unused_categories())
    numbers = np.concatenate([_array(piece) for piece in pieces] or [np.empty(0)])
    series = pandas.Series(rounded(column, numbers))
    return series.astype("Int64") if column.kind is Kind.WHOLE else series


def _array(cells: Cells) -> Any:
    assert not isinstance(cells, Coded | Numbered)  # noqa: S101 (the column's kind says so)
    return cells


def _text(pandas: Any, cells: Cells) -> Any:
    if isinstance(cells, Coded):
        words = [word for word in cells.words if word]
        codes = np.array([words.index(word) if word else -1 for word in cells.words] or [-1])
        return pandas.Series(pandas.Categorical.from_codes(codes[cells.codes], words))
    assert isinstance(cells, Numbered)  # noqa: S101 (the column's kind says so)
    return _text(pandas, cells.word).astype("str") + "-" + pandas.Series(cells.number).astype("str")
