"""Giving back the room that deleted rows have left, and bringing the database's own statistics up to date."""

from __future__ import annotations

import sqlite3
from contextlib import closing
from pathlib import Path

from sqlalchemy import text
from sqlalchemy.engine import make_url

from ginnel.store.engine import make_engine, translated

#: A SQLite file is rewritten only if at least so much of it is empty: that costs time and wears a card.
LEAST_EMPTY_SHARE = 0.25


def vacuum(url: str, least_empty_share: float = LEAST_EMPTY_SHARE) -> int:
    """Tidy the store at a URL; gives by how many bytes a SQLite file shrank.

    While a SQLite file is rewritten nobody else can write, and it takes as much room again.

    Raises
    ------
    StoreFullError
        There is no room for the new file. The old one stays.
    StoreError
        It is in use or cannot be written.
    """
    parsed = make_url(url)
    if parsed.get_backend_name() == "sqlite":
        with translated(parsed):
            return _vacuum_sqlite(Path(parsed.database or ""), least_empty_share)
    engine = make_engine(url).execution_options(isolation_level="AUTOCOMMIT")
    try:
        with translated(parsed), engine.connect() as connection:
            schema = connection.execute(text("SELECT current_schema()")).scalar_one()
            tables = connection.execute(
                text("SELECT tablename FROM pg_tables WHERE schemaname = :schema"), {"schema": schema}
            ).scalars()
            for table in sorted(tables):
                connection.execute(text(f'VACUUM (ANALYZE) "{table}"'))
    finally:
        engine.dispose()
    return 0


def _vacuum_sqlite(path: Path, least_empty_share: float) -> int:
    uri = f"{path.absolute().as_uri()}?mode=rw"
    with closing(sqlite3.connect(uri, uri=True, timeout=10.0, isolation_level=None)) as connection:
        connection.execute("PRAGMA optimize")
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
        n_pages = connection.execute("PRAGMA page_count").fetchone()[0]
        n_empty = connection.execute("PRAGMA freelist_count").fetchone()[0]
        if n_empty == 0 or n_empty < least_empty_share * n_pages:
            return 0
        before = path.stat().st_size
        connection.execute("VACUUM")
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
        return before - path.stat().st_size
