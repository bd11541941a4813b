"""A clock that stands still until a test moves it, so that no test waits for time to pass."""

from __future__ import annotations

from threading import Event, Lock

from ginnel.clock import ClockReading
from ginnel.words import US_PER_S

START_US = 1_772_438_400 * US_PER_S  # 2026-03-02T08:00:00Z


class FedClock:
    """Wall, steady and sleeping time, each moved by hand. Waiting takes no longer than a moment."""

    def __init__(self, wall_us: int = START_US, *, is_set: bool = True) -> None:
        self._lock = Lock()
        self._wall_us, self._steady_us, self._asleep_us = wall_us, 1_000 * US_PER_S, 0
        self.is_set = is_set

    def read(self) -> ClockReading:
        with self._lock:
            return ClockReading(
                wall_us=self._wall_us,
                steady_us=self._steady_us,
                asleep_us=self._asleep_us,
                is_set=self.is_set,
            )

    def wait(self, event: Event, seconds: float) -> bool:
        return event.wait(min(seconds, 0.002))

    def pass_s(self, seconds: float) -> None:
        """Time goes by."""
        with self._lock:
            self._wall_us += round(seconds * US_PER_S)
            self._steady_us += round(seconds * US_PER_S)

    def step_s(self, seconds: float) -> None:
        """Somebody sets the wall clock."""
        with self._lock:
            self._wall_us += round(seconds * US_PER_S)

    def sleep_s(self, seconds: float) -> None:
        """The machine is suspended."""
        with self._lock:
            self._wall_us += round(seconds * US_PER_S)
            self._asleep_us += round(seconds * US_PER_S)
