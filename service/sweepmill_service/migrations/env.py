"""Alembic's entry: runs on the connection that migrations.run hands over."""

from alembic import context

from sweepmill_service.schema import metadata

context.configure(
    connection=context.config.attributes["connection"],
    target_metadata=metadata,
    render_as_batch=True,
    transactional_ddl=True,
)
context.run_migrations()
