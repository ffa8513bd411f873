"""The history of the tables, for Alembic. Run through `storage.migrate`, never by hand."""
