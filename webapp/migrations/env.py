"""Runs the migrations on the connection that webapp.migrate opened, in its one transaction."""

from alembic import context

from webapp.models import Base

context.configure(
    connection=context.config.attributes["connection"],
    target_metadata=Base.metadata,
    render_as_batch=True,
    transactional_ddl=False,  # webapp.migrate holds the transaction
)
context.run_migrations()
