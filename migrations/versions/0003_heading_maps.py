"""Heading maps: how files of one kind are read."""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

from sameline.records.append_only import guard

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "heading_map",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("form", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_heading_map_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_heading_map")),
    )
    bind = op.get_bind()
    for statement in guard(bind.dialect.name, "heading_map", [["id"]]):
        op.execute(statement)
