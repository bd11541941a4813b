"""When a recording began: what was given, what the file says of itself, what its name says.

In that order. A time without a zone is taken as UTC wherever it stands, since a recorder that means
local time cannot be told from one that does not; give ``--started-at`` where that is wrong.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta, timezone
from enum import StrEnum
from pathlib import Path

from ginnel.errors import CaptureTimeError
from ginnel.times import to_us

_MEND = "put it into the file name, or replay the file with --started-at 2026-03-02T08:15:00Z"

# ISO 8601, basic or extended, with the marks that file names allow instead of the colon.
_STAMP = re.compile(
    r"(?<!\d)(?P<year>\d{4})-?(?P<month>\d{2})-?(?P<day>\d{2})"
    r"[Tt_ ](?P<hour>\d{2})[-:_.h]?(?P<minute>\d{2})(?:[-:_.m]?(?P<second>\d{2})(?:[.,](?P<part>\d{1,9}))?)?"
    r"(?!\d)(?P<zone>[Zz](?![A-Za-z])|[+-](?:0\d|1[0-4])[:-]?(?:00|15|30|45)(?!\d))?"
)


class StartSource(StrEnum):
    """Who says when a recording began."""

    GIVEN = "given"
    HEADER = "the file's own header"
    NAME = "the file name"


@dataclass(frozen=True, slots=True, kw_only=True)
class Start:
    """When a recording began, and who says so."""

    started_us: int
    source: StartSource


def find_start(path: Path, *, given_us: int | None, header_us: int | None) -> Start:
    """Settle when a recording began.

    Raises
    ------
    CaptureTimeError
        Nothing tells, or the stamp in the file name is no date.
    """
    if given_us is not None:
        return Start(started_us=given_us, source=StartSource.GIVEN)
    if header_us is not None:
        return Start(started_us=header_us, source=StartSource.HEADER)
    named_us = stamp_us(path)
    if named_us is None:
        raise CaptureTimeError(f"{path}: neither header nor name tells when it starts; {_MEND}")
    return Start(started_us=named_us, source=StartSource.NAME)


def stamp_us(path: Path) -> int | None:
    """Read the first ISO 8601 stamp in a file name; None if there is none.

    ``20260302T081500Z``, ``2026-03-02T08-15-00.250+0100``, ``2026-03-02_08-15`` and the like.
    """
    found = _STAMP.search(path.name)
    if found is None:
        return None
    parts = found.groupdict()
    micro = int(((parts["part"] or "") + "000000")[:6])
    try:
        moment = datetime(
            int(parts["year"]),
            int(parts["month"]),
            int(parts["day"]),
            int(parts["hour"]),
            int(parts["minute"]),
            int(parts["second"] or 0),
            micro,
            tzinfo=_zone(parts["zone"]),
        )
    except ValueError as exc:
        raise CaptureTimeError(f"{path}: {found.group()} in the name is no time ({exc}); {_MEND}") from exc
    return to_us(moment)


def text_us(text: str) -> int | None:
    """Read an RFC 3339 time, with or without zone (then UTC); None if it is none."""
    try:
        moment = datetime.fromisoformat(text.strip().upper())
    except ValueError:
        return None
    return to_us(moment if moment.tzinfo else moment.replace(tzinfo=UTC))


def _zone(text: str | None) -> timezone:
    if not text or text in "Zz":
        return UTC
    digits = re.sub(r"\D", "", text)
    offset = timedelta(hours=int(digits[:2]), minutes=int(digits[2:]))
    return timezone(-offset if text[0] == "-" else offset)
