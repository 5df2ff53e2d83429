"""Alembic's entry: runs on the connection handed over by ``migrate.upgrade``, inside its transaction."""

from alembic import context
from orchil.store.models import metadata

context.configure(
    connection=context.config.attributes["connection"],
    target_metadata=metadata,
    render_as_batch=True,
    transactional_ddl=True,
    compare_type=True,
)
with context.begin_transaction():
    context.run_migrations()
