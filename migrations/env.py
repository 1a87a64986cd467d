"""Runs migrations on the connection that the caller opened; it never opens, commits or logs anything.

The caller (campaign.catalogue.upgrade) holds the one transaction that the whole upgrade runs in.
"""

from __future__ import annotations

from alembic import context

connection = context.config.attributes["connection"]
context.configure(
    connection=connection,
    # SQLite can roll back DDL once its driver is kept from committing by itself.
    transactional_ddl=True,
)
with context.begin_transaction():
    context.run_migrations()
