"""Forecasts as they were kept: what was asked and used, and the distribution of each date.

Revision ID: 0003
Revises: 0002
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None

UTC_TEXT = sa.String(27)
WORD = sa.String(32)
IN_USE = "withdrawn_at IS NULL"


def upgrade() -> None:
    _create_keepings()
    _create_kept_forecasts()


def _create_keepings() -> None:
    op.create_table(
        "keepings",
        sa.Column("id", sa.Integer, nullable=False),
        sa.Column("label", sa.String(100)),
        sa.Column("label_key", sa.String(100)),
        sa.Column("as_of_bmjd_tdb", sa.Double, nullable=False),
        sa.Column("from_bmjd_tdb", sa.Double, nullable=False),
        sa.Column("until_bmjd_tdb", sa.Double, nullable=False),
        sa.Column("known_at", UTC_TEXT, nullable=False),
        sa.Column("draws", sa.Integer, nullable=False),
        sa.Column("seed", sa.Integer, nullable=False),
        sa.Column("program_version", sa.String(50), nullable=False),
        sa.Column("kept_at", UTC_TEXT, nullable=False),
        sa.Column("withdrawn_at", UTC_TEXT),
        sa.PrimaryKeyConstraint("id", name="pk_keepings"),
        sa.CheckConstraint("(label IS NULL) = (label_key IS NULL)", name="ck_keepings_label"),
    )
    where = sa.text(IN_USE)
    op.create_index(
        "uq_keepings_label_key",
        "keepings",
        ["label_key"],
        unique=True,
        sqlite_where=where,
        postgresql_where=where,
    )


def _create_kept_forecasts() -> None:
    op.create_table(
        "kept_forecasts",
        sa.Column("id", sa.Integer, nullable=False),
        sa.Column("keeping_id", sa.Integer, nullable=False),
        sa.Column("system_id", sa.Integer, nullable=False),
        sa.Column("event", WORD, nullable=False),
        sa.Column("cycle", sa.Integer),
        sa.Column("basis", WORD, nullable=False),
        sa.Column("solution", sa.Text, nullable=False),
        sa.Column("rule", sa.String(32)),
        sa.Column("status", WORD, nullable=False),
        sa.Column("probability", sa.Double),
        sa.Column("probability_in_window", sa.Double),
        sa.Column("probability_per_yr", sa.Double),
        sa.Column("disagreement_sigma", sa.Double),
        sa.Column("is_observed", sa.Integer, nullable=False),
        sa.Column("is_phase_lost", sa.Integer, nullable=False),
        sa.Column("median_bmjd_tdb", sa.Double),
        sa.Column("sigma_d", sa.Double),
        sa.Column("lo68_bmjd_tdb", sa.Double),
        sa.Column("hi68_bmjd_tdb", sa.Double),
        sa.Column("lo95_bmjd_tdb", sa.Double),
        sa.Column("hi95_bmjd_tdb", sa.Double),
        sa.Column("quantiles", sa.Text),
        sa.Column("reference_bmjd_tdb", sa.Double),
        sa.Column("reference_sigma_d", sa.Double),
        sa.Column("inputs", sa.Text, nullable=False),
        sa.Column("notes", sa.Text, nullable=False),
        sa.Column("withdrawn_at", UTC_TEXT),
        sa.PrimaryKeyConstraint("id", name="pk_kept_forecasts"),
        sa.ForeignKeyConstraint(["keeping_id"], ["keepings.id"], name="fk_kept_forecasts_keeping_id"),
        sa.ForeignKeyConstraint(["system_id"], ["systems.id"], name="fk_kept_forecasts_system_id"),
        sa.CheckConstraint("probability >= 0 AND probability <= 1", name="ck_kept_forecasts_probability"),
    )
    op.create_index("ix_kept_forecasts_keeping_id", "kept_forecasts", ["keeping_id"])
    op.create_index("ix_kept_forecasts_system_id", "kept_forecasts", ["system_id"])
