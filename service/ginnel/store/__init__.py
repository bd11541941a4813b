"""The log on disk: spans and passages, in SQLite or PostgreSQL.

In come words (`Sensor`, `Span`, `Passage`), out go the same words; rows and SQL never leave this
folder. It knows nothing of signals, files of samples or pages. Every write is one transaction, so
that a power cut leaves either the whole of a span or nothing of it.
"""

from ginnel.store.columns import Coded, PassageColumns, iter_passage_columns
from ginnel.store.engine import Store, open_store
from ginnel.store.log import SpanChange, extend_span, put_sensor, put_site, record_span
from ginnel.store.query import (
    LoggedPassage,
    LoggedSpan,
    PassageArrays,
    extent_us,
    iter_passages,
    latest_passages,
    passage_arrays,
    sensors,
    site,
    spans,
)
from ginnel.store.schema import check, current, upgrade

__all__ = [
    "Coded",
    "LoggedPassage",
    "LoggedSpan",
    "PassageArrays",
    "PassageColumns",
    "SpanChange",
    "Store",
    "check",
    "current",
    "extend_span",
    "extent_us",
    "iter_passage_columns",
    "iter_passages",
    "latest_passages",
    "open_store",
    "passage_arrays",
    "put_sensor",
    "put_site",
    "record_span",
    "sensors",
    "site",
    "spans",
    "upgrade",
]
