"""``[sensor.source]``: where samples come from."""

from __future__ import annotations

from enum import StrEnum
from typing import Literal

from pydantic import Field, model_validator

from ginnel.config.section import Section

#: A sample type as SigMF spells it: one channel or two, kind and bits, byte order.
SAMPLE_TYPE_PATTERN = r"^([rc])(i8|u8|i16_(le|be)|i24_(le|be)|i32_(le|be)|f32_(le|be)|f64_(le|be))$"


class SourceKind(StrEnum):
    """The ways in which samples can come."""

    FOLDER = "folder"
    SOUND = "sound"
    PIPE = "pipe"
    TCP = "tcp"
    SERIAL = "serial"


_RAW_KEYS = frozenset({"rate_hz", "sample_type", "reconnect_s"})
#: Which keys go with which kind.
KEYS = {
    SourceKind.FOLDER: frozenset({"path", "settle_s", "after", "archive"}),
    SourceKind.SOUND: frozenset({"device", "rate_hz", "reconnect_s", "gain_note"}),
    SourceKind.PIPE: frozenset({"path", *_RAW_KEYS}),
    SourceKind.TCP: frozenset({"host", "port", *_RAW_KEYS}),
    SourceKind.SERIAL: frozenset({"path", "baud", *_RAW_KEYS}),
}
_NEEDED = {
    SourceKind.FOLDER: (),
    SourceKind.SOUND: ("rate_hz",),
    SourceKind.PIPE: ("path", "rate_hz"),
    SourceKind.TCP: ("host", "port", "rate_hz"),
    SourceKind.SERIAL: ("path", "rate_hz"),
}


class SourceSettings(Section):
    """``[sensor.source]``: where samples come from; most keys go with some kinds only."""

    kind: SourceKind = SourceKind.FOLDER
    path: str = Field(default="captures", min_length=1)
    device: str | None = Field(default=None, min_length=1)
    host: str | None = Field(default=None, min_length=1)
    port: int | None = Field(default=None, ge=1, le=65535)
    baud: int = Field(default=921_600, ge=9_600, le=12_000_000)
    rate_hz: float | None = Field(default=None, ge=1_000, le=192_000)
    sample_type: str | None = Field(default=None, pattern=SAMPLE_TYPE_PATTERN)
    reconnect_s: float = Field(default=30.0, ge=0.1, le=3600)
    gain_note: str | None = Field(default=None, max_length=200)
    settle_s: float = Field(default=5.0, ge=0.1, le=3600)
    after: Literal["keep", "archive", "delete"] = "keep"
    archive: str | None = Field(default=None, min_length=1)

    @model_validator(mode="after")
    def _fitting(self) -> SourceSettings:
        given = self.model_fields_set - {"kind"}
        if strange := sorted(given - KEYS[self.kind]):
            raise ValueError(f'{strange[0]} does not go with kind = "{self.kind.value}"')
        if missing := [key for key in _NEEDED[self.kind] if key not in given]:
            raise ValueError(f'kind = "{self.kind.value}" needs {missing[0]}')
        if (self.archive is not None) != (self.after == "archive"):
            raise ValueError('after = "archive" and archive (a folder) go together')
        return self
