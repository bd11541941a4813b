"""What one minute says of each condition, in a plain sentence.

Thresholds come in pairs, to raise and to clear, and are common practice without a source unless one is
named.
"""

from __future__ import annotations

from collections.abc import Iterator

from ginnel.daemon.conditions import Finding
from ginnel.daemon.health import ComputerHealth, SensorMinute
from ginnel.daemon.usual import Usual
from ginnel.words import HealthSample, Sensor

#: The noise of a converter of 16 bits alone: about one step of it.
_DEAD_DBFS = (-84.0, -80.0)
_CLIPPED_SHARE = (1e-3, 1e-4)
_LAMP_DB = (20.0, 14.0)
_HUM_DB = (30.0, 24.0)
_LAG_S = (30.0, 10.0)
_QUIETER_DB = (10.0, 6.0)
#: By chance alone nobody passes where thirty are usual once in 10^13.
_MISSED_PASSAGES = 30.0
_HOT_C = (80.0, 75.0)
_ROOM_AGAIN = 1.1


def sensor_findings(minute: SensorMinute, usual: Usual) -> Iterator[Finding]:
    """What a sensor's minute says."""
    sensor, sample = minute.sensor, minute.sample
    has_samples = sample.listened_s > 0

    def finding(kind: str, is_bad: bool | None, sentence: str) -> Finding:
        return Finding(kind=kind, sensor=sensor.name, is_bad=is_bad, sentence=f"{sensor.name}: {sentence}")

    yield finding("source-lost", minute.lost is not None, f"the source is lost: {minute.lost}.")
    is_silent = minute.is_steady and not has_samples and minute.lost is None
    yield finding("no-samples", is_silent, "no samples have come for minutes.")
    yield finding("input-dead", _is_dead(minute), _dead_text(minute))
    yield finding(
        "input-clips",
        _beyond(sample.clipped_share, *_CLIPPED_SHARE),
        f"the input clips: {100 * (sample.clipped_share or 0):.1f} % of samples are at full scale.",
    )
    yield finding("lamp-line", _has_lamp_line(sensor, sample), _lamp_text(sample))
    yield finding(
        "mains-hum",
        _beyond(sample.hum_db, *_HUM_DB),
        f"mains hum stands {sample.hum_db or 0:.0f} dB above the noise.",
    )
    yield finding(
        "only-noise",
        True if usual.missed_passages >= _MISSED_PASSAGES else False if usual.has_passed else None,
        f"only noise is heard: nobody has passed where about {usual.missed_passages:.0f} are usual.",
    )
    quieter_db = _difference(usual.noise_dbfs_hz, sample.noise_dbfs_hz)
    yield finding(
        "quieter-than-usual",
        _beyond(quieter_db, *_QUIETER_DB),
        f"its noise is {quieter_db or 0:.0f} dB weaker than last week, as if the module were off.",
    )
    yield finding(
        "samples-dropped",
        sample.dropped_samples > 0,
        f"{sample.dropped_samples} samples were dropped within a minute.",
    )
    yield finding(
        "lagging",
        _beyond(sample.lag_s, *_LAG_S),
        f"listening is {sample.lag_s or 0:.0f} s behind what comes in.",
    )


def computer_findings(
    computer: ComputerHealth, *, clock_is_set: bool, keep_free_bytes: int, store_trouble: str | None
) -> Iterator[Finding]:
    """What the minute says of the computer that all sensors share."""

    def finding(kind: str, is_bad: bool | None, sentence: str) -> Finding:
        return Finding(kind=kind, sensor=None, is_bad=is_bad, sentence=sentence)

    yield finding("clock-not-set", not clock_is_set, "The clock has not been set since the computer started.")
    free = computer.disk_free_bytes
    for kind, least, word in (
        ("disk-nearly-full", keep_free_bytes, "nearly full"),
        ("disk-full", full_below_bytes(keep_free_bytes), "full"),
    ):
        yield finding(
            kind,
            None if free is None else _beyond(-free, -least, -least * _ROOM_AGAIN),
            f"The disk is {word}: {(free or 0) / 1e6:.0f} MB are free.",
        )
    yield finding(
        "store-unreachable", store_trouble is not None, f"The store cannot be written: {store_trouble}."
    )
    yield finding(
        "too-hot",
        _beyond(computer.temperature_c, *_HOT_C),
        f"The computer is at {computer.temperature_c or 0:.0f} °C.",
    )


def full_below_bytes(keep_free_bytes: int) -> int:
    """Free space below which housekeeping stops writing: a fifth of what should be free."""
    return keep_free_bytes // 5


def _beyond(value: float | None, raise_at: float, clear_at: float) -> bool | None:
    """Bad from one threshold on, good below the other, neither in between or where nothing is known."""
    if value is None or clear_at <= value < raise_at:
        return None
    return value >= raise_at


def _is_dead(minute: SensorMinute) -> bool | None:
    level_dbfs = minute.sample.level_dbfs
    if level_dbfs is None:
        return None
    return minute.is_constant or _beyond(-level_dbfs, -_DEAD_DBFS[0], -_DEAD_DBFS[1])


def _dead_text(minute: SensorMinute) -> str:
    if minute.is_constant:
        return "the input is dead: it gives one and the same value."
    return f"the input is dead: its level is {minute.sample.level_dbfs or 0:.0f} dBFS."


def _has_lamp_line(sensor: Sensor, sample: HealthSample) -> bool | None:
    if sample.lamp_db is None or sample.lamp_mps is None:
        return None
    if not sensor.min_speed_mps <= sample.lamp_mps <= sensor.max_speed_mps:
        return False
    return _beyond(sample.lamp_db, *_LAMP_DB)


def _lamp_text(sample: HealthSample) -> str:
    return (
        f"a lamp's line stands {sample.lamp_db or 0:.0f} dB above the noise and reads as "
        f"{sample.lamp_mps or 0:.2f} m/s, a speed that is looked for."
    )


def _difference(a: float | None, b: float | None) -> float | None:
    return None if a is None or b is None else a - b
