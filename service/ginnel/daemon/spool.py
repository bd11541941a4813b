"""A bounded queue on disk for deliveries that the store does not take now."""

from __future__ import annotations

import logging
import sqlite3
from collections.abc import Iterator, Sequence
from contextlib import closing, contextmanager, suppress
from pathlib import Path

from ginnel.daemon.deliveries import Delivery, from_json, to_json
from ginnel.errors import StoreError

log = logging.getLogger(__name__)

_PAGE_BYTES = 4096


class Spool:
    """Deliveries in order; each is there until it is removed, whatever happens to the process.

    Parameters
    ----------
    most_bytes : what finds no room in a file of this size is refused
    """

    def __init__(self, path: Path, most_bytes: int = 64_000_000) -> None:
        self._path, self._most_bytes = path, most_bytes
        self.n_waiting = 0
        if path.exists():
            try:
                self.n_waiting = self._count()
            except StoreError as exc:
                broken = path.with_suffix(".broken")
                path.replace(broken)
                log.error("%s; it is kept as %s", exc, broken)

    def append(self, deliveries: Sequence[Delivery]) -> None:
        """Add deliveries at the end, all or none.

        Raises
        ------
        StoreError
            There is no room, or the disk fails.
        """
        if not deliveries:
            return
        with self._open() as connection, connection:
            connection.executemany(
                "INSERT INTO delivery (json) VALUES (?)", [(to_json([one]),) for one in deliveries]
            )
        self.n_waiting += len(deliveries)

    def first(self, n: int) -> list[tuple[int, Delivery]]:
        """Give the oldest deliveries with their numbers."""
        with self._open() as connection:
            rows = connection.execute("SELECT id, json FROM delivery ORDER BY id LIMIT ?", (n,)).fetchall()
        return [(number, from_json(text)[0]) for number, text in rows]

    def remove(self, number: int) -> None:
        """Forget a delivery; an empty queue leaves no file."""
        with self._open() as connection, connection:
            self.n_waiting -= connection.execute("DELETE FROM delivery WHERE id = ?", (number,)).rowcount
        if self.n_waiting == 0:
            with suppress(OSError):
                self._path.unlink()

    def _count(self) -> int:
        with self._open() as connection:
            return int(connection.execute("SELECT count(*) FROM delivery").fetchone()[0])

    @contextmanager
    def _open(self) -> Iterator[sqlite3.Connection]:
        try:
            with closing(sqlite3.connect(self._path)) as connection:
                connection.execute(f"PRAGMA max_page_count = {self._most_bytes // _PAGE_BYTES}")
                connection.execute("PRAGMA synchronous = FULL")
                connection.execute(
                    "CREATE TABLE IF NOT EXISTS delivery (id INTEGER PRIMARY KEY AUTOINCREMENT, json BLOB)"
                )
                yield connection
        except sqlite3.Error as exc:
            raise StoreError(f"{self._path}: {exc}") from exc
