"""Alembic's entry: runs the migrations on the connection that Sameline hands over, or on the URL given with -x."""

from alembic import context
from sqlalchemy import create_engine

from sameline.records.tables import metadata

connection = context.config.attributes.get("connection")
if connection is None:
    url = context.get_x_argument(as_dictionary=True).get("store", "sqlite:///lab.db")
    connection = create_engine(url).connect()
context.configure(connection=connection, target_metadata=metadata)
with context.begin_transaction():
    context.run_migrations()
