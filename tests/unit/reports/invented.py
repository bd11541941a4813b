"""An invented log: sensors, spans and passages in few words."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import datetime
from zoneinfo import ZoneInfo

from ginnel.store import Store, record_span
from ginnel.times import to_us
from ginnel.words import Direction, MoverKind, Passage, Sensor, Span, Story

S = 1_000_000
MINUTE = 60 * S
HOUR = 3600 * S
DUBLIN = ZoneInfo("Europe/Dublin")
NORTH = Sensor(name="north", speed_bands_mps=(1.0, 2.0))
SOUTH = Sensor(name="south", speed_bands_mps=(1.0, 5.0))
A, R, U = Direction.APPROACHING, Direction.RECEDING, Direction.UNKNOWN


def at(*local: int) -> int:
    """Microseconds of a local time in Dublin: year, month, day, hour, minute."""
    return to_us(datetime(*local, tzinfo=DUBLIN))  # type: ignore[arg-type,misc] # year to minute


def passed(
    crossed_us: int,
    direction: Direction = A,
    speed_mps: float | None = 1.3,
    *,
    stay_s: float = 2.0,
    snr_db: float | None = None,
    story: Story = Story.PASSAGE,
    mover: MoverKind | None = None,
) -> Passage:
    half_us = round(stay_s * S / 2)
    return Passage(
        started_us=crossed_us - half_us,
        crossed_us=crossed_us,
        ended_us=crossed_us + half_us,
        story=story,
        direction=direction,
        direction_confidence=None,
        speed_mps=speed_mps,
        speed_se_mps=None,
        snr_db=snr_db,
        mover=mover,
    )


def heard(store: Store, sensor: Sensor, start_us: int, end_us: int, passages: Iterable[Passage] = ()) -> None:
    span = Span(started_us=start_us, ended_us=end_us, sample_rate_hz=8000.0)
    record_span(store, sensor, span, passages, "1")


def spread(start_us: int, end_us: int, n: int, ways: Sequence[Direction] = (A,)) -> list[Passage]:
    """n passages, evenly apart, with the directions in turn."""
    step_us = (end_us - start_us) // max(n, 1)
    return [passed(start_us + i * step_us + step_us // 2, ways[i % len(ways)]) for i in range(n)]
