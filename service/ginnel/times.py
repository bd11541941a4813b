"""Times as whole microseconds since 1970 UTC, and as text."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta, tzinfo

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
_US = timedelta(microseconds=1)


def to_us(moment: datetime) -> int:
    """Microseconds since 1970 UTC of an aware time, exactly."""
    if moment.utcoffset() is None:
        raise ValueError(f"{moment} has no UTC offset")
    return (moment - _EPOCH) // _US


def from_us(moment_us: int, zone: tzinfo = UTC) -> datetime:
    """Aware time in a zone, exactly."""
    return (_EPOCH + timedelta(microseconds=moment_us)).astimezone(zone)


def utc_text(moment_us: int) -> str:
    """RFC 3339 in UTC with all six digits: ``2026-03-02T09:15:04.250000Z``."""
    text = (_EPOCH + timedelta(microseconds=moment_us)).isoformat(timespec="microseconds")
    return text.removesuffix("+00:00") + "Z"
