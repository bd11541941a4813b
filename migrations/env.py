"""Run by Alembic, on the connection that Ginnel hands in; by hand, on the store at GINNEL_STORE_URL."""

import os

from alembic import context
from sqlalchemy import Connection

from ginnel.store.engine import make_engine
from ginnel.store.tables import Base


def migrate(connection: Connection) -> None:
    context.configure(
        connection=connection,
        target_metadata=Base.metadata,
        render_as_batch=True,  # SQLite cannot alter most things in place
        compare_server_default=True,
    )
    with context.begin_transaction():
        context.run_migrations()


given = context.config.attributes.get("connection")
if given is not None:
    migrate(given)
else:
    engine = make_engine(os.environ.get("GINNEL_STORE_URL", "sqlite:///ginnel.db"), create=True)
    with engine.begin() as own:
        migrate(own)
    engine.dispose()
