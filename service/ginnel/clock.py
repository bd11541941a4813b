"""The machine's clocks, read together; a parameter everywhere, so that tests bring their own."""

from __future__ import annotations

import ctypes
import time
from dataclasses import dataclass
from threading import Event
from typing import Protocol

from ginnel.words import US_PER_S

#: No sample was ever heard before this program was written: 2026-01-01T00:00:00Z.
EARLIEST_US = 1_767_225_600 * US_PER_S
#: Size of the kernel's struct timex is 208 bytes on 64-bit Linux; more does no harm.
_TIMEX_BYTES = 512
#: What adjtimex(2) answers while nobody has set the clock.
_TIME_ERROR = 5


@dataclass(frozen=True, slots=True, kw_only=True)
class ClockReading:
    """One moment, as each clock has it."""

    wall_us: int  # UTC, microseconds since 1970; may be wrong, and may step
    steady_us: int  # since boot, never steps; stands still while the machine sleeps
    asleep_us: int  # slept since boot
    is_set: bool  # whether the wall clock is known to be right


class Clock(Protocol):
    """Time, and waiting for it."""

    def read(self) -> ClockReading:
        """Read all clocks at once."""

    def wait(self, event: Event, seconds: float) -> bool:
        """Wait for an event, so long at most; tells whether it came."""


class SystemClock:
    """The clocks of this machine.

    The wall clock counts as set once the kernel says so, which NTP and chrony tell it (adjtimex(2)). Where
    something else keeps it right, ``is_always_set`` trusts any time after this program was written.
    """

    def __init__(self, *, is_always_set: bool = False) -> None:
        self._is_always_set = is_always_set
        self._libc = None if is_always_set else ctypes.CDLL(None)

    def read(self) -> ClockReading:
        """Read all clocks at once."""
        steady_us = time.clock_gettime_ns(time.CLOCK_MONOTONIC) // 1000
        boot_us = time.clock_gettime_ns(time.CLOCK_BOOTTIME) // 1000
        wall_us = time.time_ns() // 1000
        return ClockReading(
            wall_us=wall_us,
            steady_us=steady_us,
            asleep_us=boot_us - steady_us,
            is_set=wall_us >= EARLIEST_US and (self._is_always_set or self._is_synchronised()),
        )

    def wait(self, event: Event, seconds: float) -> bool:
        """Wait for an event, so long at most; tells whether it came."""
        return event.wait(seconds)

    def _is_synchronised(self) -> bool:
        if self._libc is None:
            return False
        state: int = self._libc.adjtimex(ctypes.create_string_buffer(_TIMEX_BYTES))
        return 0 <= state < _TIME_ERROR
