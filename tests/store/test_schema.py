"""Migrations: empty to head, back and forth, on a filled store; no drift; old and new stores are told."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

import pytest
from alembic import command
from alembic.script import ScriptDirectory
from sqlalchemy import CheckConstraint, Connection, inspect, text

from ginnel.errors import SchemaMismatchError, StoreError
from ginnel.store import (
    check,
    current,
    find_faults,
    hourly_counts,
    hourly_listening,
    iter_passages,
    open_store,
    record_span,
    roll_up_hours,
    schema,
    spans,
    upgrade,
)
from ginnel.store.engine import make_engine
from ginnel.store.tables import Base
from ginnel.words import Direction, Passage, Sensor, Span


@contextmanager
def connected(url: str) -> Iterator[Connection]:
    engine = make_engine(url, create=True)
    try:
        with engine.begin() as connection:
            yield connection
    finally:
        engine.dispose()


def tables_of(url: str) -> set[str]:
    with connected(url) as connection:
        return set(inspect(connection).get_table_names())


def say(url: str, statement: str) -> None:
    with connected(url) as connection:
        connection.execute(text(statement))


def test_an_empty_database_is_brought_to_head(store_url: str) -> None:
    upgrade(store_url)
    assert current(store_url) == schema.HEAD
    assert tables_of(store_url) == {*Base.metadata.tables, "alembic_version"}


def test_head_to_base_to_head(store_url: str) -> None:
    upgrade(store_url)
    schema.downgrade(store_url, "base")
    assert tables_of(store_url) == {"alembic_version"}
    assert current(store_url) is None
    upgrade(store_url)
    assert tables_of(store_url) == {*Base.metadata.tables, "alembic_version"}


def test_models_and_migrations_agree(store_url: str) -> None:
    upgrade(store_url)
    config = schema.alembic_config()
    with connected(store_url) as connection:
        config.attributes["connection"] = connection
        command.check(config)  # raises where they drift apart


def test_checks_of_models_and_migrations_agree(store_url: str) -> None:
    """What Alembic does not compare: the names of CHECK constraints."""
    upgrade(store_url)
    with connected(store_url) as connection:
        for table in Base.metadata.tables.values():
            ours = [one for one in table.constraints if isinstance(one, CheckConstraint)]
            named = {connection.dialect.identifier_preparer.format_constraint(one) for one in ours}
            theirs = inspect(connection).get_check_constraints(table.name)
            assert {one["name"] for one in theirs} == named, table.name


def test_upgrading_a_filled_store_keeps_what_is_in_it(store_url: str) -> None:
    sensor = Sensor(name="north")
    span = Span(started_us=0, ended_us=60_000_000, sample_rate_hz=8000.0)
    passage = Passage(
        started_us=1,
        crossed_us=2,
        ended_us=3,
        direction=Direction.RECEDING,
        direction_confidence=0.9,
        speed_mps=1.25,
        speed_se_mps=None,
        snr_db=12.0,
    )
    for revision in list(reversed(list(revisions()))):
        # Fill as soon as the tables are those of today; older ones get their own rows when there are any.
        upgrade(store_url, revision)
        if revision == schema.HEAD:
            with open_store(store_url) as store:
                record_span(store, sensor, span, [passage], "1")
    upgrade(store_url)
    with open_store(store_url) as store:
        assert [one.passage for one in iter_passages(store)] == [passage]
        assert [one.span for one in spans(store)] == [span]


def test_what_was_logged_before_there_were_roll_ups_is_rolled_up(store_url: str) -> None:
    """A store of the first version: a span over three hours, and a crossing just after it, in a fourth."""
    hour_us = 3_600_000_000
    upgrade(store_url, "0001")
    say(
        store_url,
        "INSERT INTO sensor (id, name, carrier_hz, channels, swap_iq, mains_hz, speed_bands_mps,"
        " min_speed_mps, max_speed_mps, approaching_name, receding_name)"
        " VALUES (1, 'north', 1e10, 'mono', FALSE, 50, '[]', 0.3, 5, 'in', 'out')",
    )
    say(
        store_url,
        "INSERT INTO mounting (id, sensor_id, aspect, height_m, offset_m, beam_angle_deg, tilt_deg)"
        " VALUES (1, 1, 'axial', 2, 0, 0, 0)",
    )
    say(
        store_url,
        "INSERT INTO reading (id, sensor_id, mounting_id, chain_version, settings) VALUES (1, 1, 1, '1', '')",
    )
    say(
        store_url,
        "INSERT INTO span (sensor_id, reading_id, started_us, ended_us, sample_rate_hz, clock_trusted)"
        f" VALUES (1, 1, {10 * hour_us + 1}, {13 * hour_us}, 8000, TRUE)",
    )
    for crossed_us in (11 * hour_us, 11 * hour_us + 1, 13 * hour_us + 5):
        say(
            store_url,
            "INSERT INTO passage (sensor_id, crossed_us, started_us, ended_us, reading_id, story, direction,"
            " flags)"
            f" VALUES (1, {crossed_us}, {11 * hour_us}, {11 * hour_us}, 1, 0, 1, 0)",
        )
    upgrade(store_url)
    with open_store(store_url) as store:
        for _ in range(2):
            counts = hourly_counts(store, "north", 0, 99 * hour_us)
            assert counts.hour_us.tolist() == [11 * hour_us, 13 * hour_us]
            assert counts.count.tolist() == [2, 1]
            listening = hourly_listening(store, "north", 0, 99 * hour_us)
            assert listening.listened_us.tolist() == [hour_us - 1, hour_us, hour_us]
            assert roll_up_hours(store, 99 * hour_us) in (4, 0)
        assert find_faults(store) == []


def revisions() -> list[str]:
    return [one.revision for one in ScriptDirectory.from_config(schema.alembic_config()).walk_revisions()]


def test_the_head_that_the_program_knows_is_the_last_migration() -> None:
    assert revisions()[0] == schema.HEAD
    assert sorted(revisions(), reverse=True) == revisions()  # the number tells the age


def test_a_store_without_tables_is_refused(store_url: str) -> None:
    assert tables_of(store_url) == set()  # makes the SQLite file
    with pytest.raises(SchemaMismatchError, match="has no tables yet: run `ginnel store upgrade`"):
        open_store(store_url)


def test_an_older_store_is_refused(store_url: str) -> None:
    upgrade(store_url)
    say(store_url, "UPDATE alembic_version SET version_num = '0000'")
    with pytest.raises(
        SchemaMismatchError, match=r"older Ginnel \(0000, now .*\): run `ginnel store upgrade`"
    ):
        open_store(store_url)


def test_a_newer_store_is_refused_even_for_upgrading(store_url: str) -> None:
    upgrade(store_url)
    say(store_url, "UPDATE alembic_version SET version_num = '9999'")
    with pytest.raises(SchemaMismatchError, match=r"newer Ginnel \(9999, .*upgrade Ginnel"):
        open_store(store_url, create=True)
    with pytest.raises(SchemaMismatchError, match="does not know"):
        upgrade(store_url)
    assert current(store_url) == "9999"


def test_tables_of_somebody_else_are_left_alone(store_url: str) -> None:
    say(store_url, "CREATE TABLE orders (id INTEGER PRIMARY KEY)")
    for attempt in (upgrade, open_store):
        with pytest.raises(StoreError, match="tables that are not Ginnel's"):
            attempt(store_url)
    assert tables_of(store_url) == {"orders"}


def test_a_failing_migration_leaves_the_store_as_it_was(
    store_url: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    upgrade(store_url)
    copy = tmp_path / "migrations"
    (copy / "versions").mkdir(parents=True)
    for source in schema.migrations_dir().rglob("*.py"):
        (copy / source.relative_to(schema.migrations_dir())).write_text(source.read_text())
    (copy / "versions" / "9001_breaks.py").write_text(
        "import sqlalchemy as sa\nfrom alembic import op\n"
        f"revision = '9001'\ndown_revision = '{schema.HEAD}'\n"
        "def upgrade():\n"
        "    op.create_table('half', sa.Column('id', sa.Integer, primary_key=True))\n"
        "    op.execute('SELECT nonsense FROM nowhere')\n"
    )
    monkeypatch.setattr(schema, "migrations_dir", lambda: copy)
    with pytest.raises(StoreError, match="nowhere"):
        upgrade(store_url)
    monkeypatch.undo()
    assert "half" not in tables_of(store_url)
    with open_store(store_url) as store:
        check(store)


def test_a_table_copied_by_a_migration_keeps_its_passages(
    store_url: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """SQLite changes a table by copying and dropping it, which must not take what refers to it along."""
    with open_store(store_url, create=True) as store:
        span = Span(started_us=0, ended_us=60_000_000, sample_rate_hz=8000.0)
        record_span(store, Sensor(name="north"), span, [], "1")
        record_span(
            store, Sensor(name="north"), replace(span, started_us=60_000_000, ended_us=61_000_000), [], "1"
        )
    copy = tmp_path / "migrations"
    (copy / "versions").mkdir(parents=True)
    for source in schema.migrations_dir().rglob("*.py"):
        (copy / source.relative_to(schema.migrations_dir())).write_text(source.read_text())
    (copy / "versions" / "9001_widens.py").write_text(
        "import sqlalchemy as sa\nfrom alembic import op\n"
        f"revision = '9001'\ndown_revision = '{schema.HEAD}'\n"
        "def upgrade():\n"
        "    with op.batch_alter_table('sensor') as batch:\n"
        "        batch.alter_column('name', type_=sa.Text(), existing_type=sa.String())\n"
    )
    monkeypatch.setattr(schema, "migrations_dir", lambda: copy)
    upgrade(store_url)
    monkeypatch.setattr(schema, "HEAD", "9001")
    with open_store(store_url) as store:
        assert len(spans(store, "north")) == 2
