"""Undo, corrections and bulk loads: who took what back, and when an entry was out of use.

Revision ID: 0002
Revises: 0001
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None

UTC_TEXT = sa.String(27)
IN_USE = "withdrawn_at IS NULL"


def upgrade() -> None:
    _let_operations_undo()
    _create_lapses()
    _create_column_mappings()
    op.add_column("systems", sa.Column("withdrawn_at", UTC_TEXT))
    _free_names_of_withdrawn("system_names", ["name_key"], ["system_id", "name_rank"])
    _free_names_of_withdrawn("sites", ["name_key"])
    _free_names_of_withdrawn("solutions", ["system_id", "label_key"])
    op.add_column("observations", sa.Column("withdrawn_why", sa.String(500)))
    op.add_column("observations", sa.Column("former_sameness", sa.String(32)))


def _let_operations_undo() -> None:
    with op.batch_alter_table("operations") as batch:
        batch.add_column(sa.Column("undoes_id", sa.Integer))
        batch.create_foreign_key("fk_operations_undoes_id", "operations", ["undoes_id"], ["id"])
        batch.create_unique_constraint("uq_operations_undoes_id", ["undoes_id"])


def _create_lapses() -> None:
    op.create_table(
        "lapses",
        sa.Column("id", sa.Integer, nullable=False),
        sa.Column("table_name", sa.String(63), nullable=False),
        sa.Column("row_id", sa.Integer),
        sa.Column("brought_by_id", sa.Integer),
        sa.Column("from_at", UTC_TEXT, nullable=False),
        sa.Column("until_at", UTC_TEXT, nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_lapses"),
        sa.ForeignKeyConstraint(["brought_by_id"], ["operations.id"], name="fk_lapses_brought_by_id"),
        sa.CheckConstraint("(row_id IS NULL) <> (brought_by_id IS NULL)", name="ck_lapses_rows"),
    )


def _create_column_mappings() -> None:
    op.create_table(
        "column_mappings",
        sa.Column("id", sa.Integer, nullable=False),
        sa.Column("name", sa.String(200), nullable=False),
        sa.Column("name_key", sa.String(200), nullable=False),
        sa.Column("kind", sa.String(32), nullable=False),
        sa.Column("document", sa.Text, nullable=False),
        sa.Column("entered_at", UTC_TEXT, nullable=False),
        sa.Column("operation_id", sa.Integer, nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_column_mappings"),
        sa.UniqueConstraint("name_key", name="uq_column_mappings_name_key"),
        sa.ForeignKeyConstraint(["operation_id"], ["operations.id"], name="fk_column_mappings_operation_id"),
        sa.CheckConstraint("name_key <> ''", name="ck_column_mappings_name_key"),
    )


def _free_names_of_withdrawn(table: str, *unique: list[str]) -> None:
    """Names are unique among the entries in use only, so that one taken back does not block its name."""
    names = [f"uq_{table}_{'_'.join(columns)}" for columns in unique]
    with op.batch_alter_table(table) as batch:
        batch.add_column(sa.Column("withdrawn_at", UTC_TEXT))
        for name in names:
            batch.drop_constraint(name, type_="unique")
    where = sa.text(IN_USE)
    for name, columns in zip(names, unique, strict=True):
        op.create_index(name, table, columns, unique=True, sqlite_where=where, postgresql_where=where)
