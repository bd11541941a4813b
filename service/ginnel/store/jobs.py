"""How far each job of housekeeping got, so that one missed or doubled does no harm."""

from __future__ import annotations

from dataclasses import dataclass

from sqlalchemy import select, update
from sqlalchemy.dialects import postgresql, sqlite

from ginnel.store.engine import Store
from ginnel.store.tables import JobRow


@dataclass(frozen=True, slots=True, kw_only=True)
class JobRecord:
    """The last try of a job."""

    name: str
    done_until_us: int | None  # what is before this is done; None: never
    ran_us: int
    outcome: str  # one line
    failed: bool


def put_job(
    store: Store,
    name: str,
    *,
    ran_us: int,
    outcome: str,
    done_until_us: int | None = None,
    failed: bool = False,
) -> None:
    """Record a try. A failed one, or one without a watermark, leaves the watermark where it was."""
    values = {"ran_us": ran_us, "outcome": outcome, "failed": failed}
    if done_until_us is not None and not failed:
        values["done_until_us"] = done_until_us
    dialect = sqlite if store.dialect == "sqlite" else postgresql
    with store.writing() as connection:
        if connection.execute(update(JobRow).where(JobRow.name == name).values(values)).rowcount == 0:
            row = dialect.insert(JobRow).values(name=name, **values)
            connection.execute(row.on_conflict_do_update(index_elements=["name"], set_=values))


def job_records(store: Store) -> dict[str, JobRecord]:
    """Last try of every job, by name."""
    with store.reading() as connection:
        rows = connection.execute(select(*JobRow.__table__.columns).order_by(JobRow.name))
        return {row.name: JobRecord(**row._mapping) for row in rows}
