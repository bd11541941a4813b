"""The log on disk: spans and passages, in SQLite or PostgreSQL.

In come words (`Sensor`, `Span`, `Passage`), out go the same words; rows and SQL never leave this
folder. It knows nothing of signals, files of samples or pages. Every write is one transaction, so
that a power cut leaves either the whole of a span or nothing of it.
"""

from ginnel.store.backup import (
    Backup,
    back_up,
    backups,
    postgresql_restore_command,
    prune_backups,
    restore_sqlite,
)
from ginnel.store.columns import Coded, PassageColumns, iter_passage_columns
from ginnel.store.engine import Store, open_store
from ginnel.store.faults import find_faults
from ginnel.store.health import (
    LoggedHealth,
    conditions,
    iter_health,
    latest_health,
    open_conditions,
    put_conditions,
    put_health,
)
from ginnel.store.hourly import (
    HourlyCounts,
    HourlyListening,
    HourlySpeeds,
    are_whole_hours,
    hourly_counts,
    hourly_listening,
    hourly_speeds,
)
from ginnel.store.hours import roll_up_hours
from ginnel.store.jobs import JobRecord, job_records, put_job
from ginnel.store.live import extend_span, kept_open, listened_until_us, redate_span
from ginnel.store.log import SpanChange, put_sensor, put_site, record_span
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
from ginnel.store.retention import (
    newest_us,
    prune_conditions,
    prune_health,
    prune_passages,
    prune_rollups,
)
from ginnel.store.rollup import Rollup, merge
from ginnel.store.schema import check, current, upgrade
from ginnel.store.series import Series, SeriesArrays, SeriesCount, all_series, put_series, series_arrays
from ginnel.store.vacuum import vacuum

__all__ = [
    "Backup",
    "Coded",
    "HourlyCounts",
    "HourlyListening",
    "HourlySpeeds",
    "JobRecord",
    "LoggedHealth",
    "LoggedPassage",
    "LoggedSpan",
    "PassageArrays",
    "PassageColumns",
    "Rollup",
    "Series",
    "SeriesArrays",
    "SeriesCount",
    "SpanChange",
    "Store",
    "all_series",
    "are_whole_hours",
    "back_up",
    "backups",
    "check",
    "conditions",
    "current",
    "extend_span",
    "extent_us",
    "find_faults",
    "hourly_counts",
    "hourly_listening",
    "hourly_speeds",
    "iter_health",
    "iter_passage_columns",
    "iter_passages",
    "job_records",
    "kept_open",
    "latest_health",
    "latest_passages",
    "listened_until_us",
    "merge",
    "newest_us",
    "open_conditions",
    "open_store",
    "passage_arrays",
    "postgresql_restore_command",
    "prune_backups",
    "prune_conditions",
    "prune_health",
    "prune_passages",
    "prune_rollups",
    "put_conditions",
    "put_health",
    "put_job",
    "put_sensor",
    "put_series",
    "put_site",
    "record_span",
    "redate_span",
    "restore_sqlite",
    "roll_up_hours",
    "sensors",
    "series_arrays",
    "site",
    "spans",
    "upgrade",
    "vacuum",
]
