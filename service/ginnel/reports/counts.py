"""How many passed, and how much of the time somebody listened."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from ginnel.reports.cells import iter_cells
from ginnel.reports.intervals import Every, period
from ginnel.reports.parts import chosen_sensors
from ginnel.stats import poisson_limits
from ginnel.store import Store
from ginnel.words import US_PER_S, Direction

#: An interval that was listened to for at least this share of it is as good as whole.
WHOLE = 0.999


@dataclass(frozen=True, slots=True, kw_only=True)
class CountRow:
    """Passages of one sensor and direction in one interval."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    direction: Direction | None  # None: all directions together
    count: int | None  # None: never listened
    count_low: float | None  # exact 95 % Poisson limits
    count_high: float | None
    corrected: float | None  # by tallies; None as long as there are none
    coverage: float  # 0 to 1
    listened_s: float
    speed_band: str | None = None  # None: all together; empty: of unknown speed
    mover: str | None = None  # None: all together; empty: cannot be told

    @property
    def is_partial(self) -> bool:
        """Whether only a part of the interval was listened to."""
        return 0 < self.coverage < WHOLE

    @property
    def expanded(self) -> float | None:
        """What the whole interval would have had, were the part not heard like the part heard."""
        return self._expanded(self.count)

    @property
    def expanded_low(self) -> float | None:
        """Lower 95 % limit of ``expanded``."""
        return self._expanded(self.count_low)

    @property
    def expanded_high(self) -> float | None:
        """Upper 95 % limit of ``expanded``."""
        return self._expanded(self.count_high)

    def _expanded(self, value: float | None) -> float | None:
        return None if value is None or self.coverage <= 0 else value / self.coverage


@dataclass(frozen=True, slots=True, kw_only=True)
class CoverageRow:
    """How much of one interval a sensor was listening."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    coverage: float
    listened_s: float


def counts(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
    by_band: bool = False,
    by_mover: bool = False,
) -> tuple[CountRow, ...]:
    """Count by interval and direction: see `iter_counts`."""
    rows = iter_counts(
        store, sensors, start_us, end_us, every, tz, together=together, by_band=by_band, by_mover=by_mover
    )
    return tuple(rows)


def iter_counts(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
    by_band: bool = False,
    by_mover: bool = False,
) -> Iterator[CountRow]:
    """Count by sensor, interval and direction, in this order.

    Every interval has a row for approaching and one for receding, and one for unknown if the sensor
    has any passage of unknown direction in the period; with ``together`` it has one row in all. Asked
    for by band or mover, each of these has a row for each speed band of the sensor, each kind of mover. The
    counts of an interval that was listened to in part are what was counted: coverage says how much
    of it that was, ``expanded`` what the whole may have had. A crossing may lie just outside the time
    listened; it is counted all the same.
    """
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    for cell in iter_cells(store, names, cut_up, together=together, by_band=by_band, by_mover=by_mover):
        low, high = (None, None) if cell.count is None else _limits(cell.count)
        yield CountRow(
            sensor=cell.sensor,
            interval_start_us=cell.start_us,
            interval_end_us=cell.end_us,
            direction=cell.part.direction,
            count=cell.count,
            count_low=low,
            count_high=high,
            corrected=None,
            coverage=cell.coverage,
            listened_s=cell.listened_us / US_PER_S,
            speed_band=cell.part.speed_band,
            mover=cell.part.mover,
        )


def coverage(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
) -> tuple[CoverageRow, ...]:
    """Tell by sensor and interval how much of it was listened to."""
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    return tuple(
        CoverageRow(
            sensor=cell.sensor,
            interval_start_us=cell.start_us,
            interval_end_us=cell.end_us,
            coverage=cell.coverage,
            listened_s=cell.listened_us / US_PER_S,
        )
        for cell in iter_cells(store, names, cut_up, together=True)
    )


@lru_cache(maxsize=10_000)
def _limits(count: int) -> tuple[float, float]:
    """Poisson limits, looked up: counts of intervals are few numbers that come again and again."""
    low, high = poisson_limits(np.array([count]))
    return float(low[0]), float(high[0])
