"""How long things are kept, where backups go, and who is told of trouble."""

from __future__ import annotations

from datetime import time
from typing import Annotated

from pydantic import Field, SecretStr, field_validator

from ginnel.config.section import Listed, Section

_Days = Annotated[int, Field(ge=0, le=36_500)]


class RetentionSettings(Section):
    """``[retention]``: how many days each kind of data is kept; 0 keeps it for ever."""

    passages_days: _Days = 0
    rollups_days: _Days = 0
    health_days: _Days = 400
    conditions_days: _Days = 1100
    evidence_days: _Days = 30
    keep_free_mb: int = Field(default=500, ge=10, le=1_000_000)


class BackupSettings(Section):
    """``[backup]``: a copy of the store every night."""

    folder: str = Field(default="backups", min_length=1)
    at_utc: time = time(2, 30)
    keep_days: int = Field(default=7, ge=0, le=3650)  # 0: no backups

    @field_validator("at_utc")
    @classmethod
    def _plain(cls, at: time) -> time:
        if at.tzinfo is not None:
            raise ValueError('a time of day in UTC, without an offset, such as "02:30"')
        return at


class NotifySettings(Section):
    """``[notify]``: who is told when a condition is raised or cleared."""

    urls: Annotated[tuple[SecretStr, ...], Listed] = ()
