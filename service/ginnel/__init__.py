"""Ginnel: a long-term occupancy and traffic-counting log for continuous-wave Doppler radar modules."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from pathlib import Path

    from ginnel.notebook import Log

__version__ = "0.1.0"


def open(where: str | Path) -> Log:
    """Open a log for reading, as pandas data frames: ``ginnel.open("ginnel.db").counts(since="2026-03-02")``.

    ``where`` is a database URL or the name of a SQLite file. It takes pandas: the extra ``notebook``.
    """
    from ginnel.notebook import open_log

    return open_log(where)
