"""What Alembic runs: the migrations, inside the transaction that `storage.migrate` opened."""

from alembic import context

from storage.tables import metadata

# No logger is configured here: the program's own log settings stand.
context.configure(
    connection=context.config.attributes["connection"],
    target_metadata=metadata,
    render_as_batch=True,
    transactional_ddl=True,
)
with context.begin_transaction():
    context.run_migrations()
