"""Public keys of persons, and checkpoints that they signed."""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

from sameline.records.append_only import guard

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "person_key",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("person", sa.Integer(), nullable=False),
        sa.Column("public", sa.LargeBinary(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_person_key_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["person"], ["person.id"], name=op.f("fk_person_key_person")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person_key")),
        sa.UniqueConstraint("public", name=op.f("uq_person_key_public")),
    )
    op.create_index(op.f("ix_person_key_person"), "person_key", ["person"], unique=False)
    op.create_table(
        "person_key_revocation",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("person_key", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_person_key_revocation_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["person_key"], ["person_key.id"], name=op.f("fk_person_key_revocation_person_key")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person_key_revocation")),
        sa.UniqueConstraint("person_key", name=op.f("uq_person_key_revocation_person_key")),
    )
    op.create_table(
        "checkpoint",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("person_key", sa.Integer(), nullable=False),
        sa.Column("entries", sa.Integer(), nullable=False),
        sa.Column("root", sa.LargeBinary(), nullable=False),
        sa.Column("laboratory", sa.Text(), nullable=False),
        sa.Column("signer", sa.Text(), nullable=False),
        sa.Column("time", sa.Text(), nullable=False),
        sa.Column("signature", sa.LargeBinary(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_checkpoint_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["person_key"], ["person_key.id"], name=op.f("fk_checkpoint_person_key")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_checkpoint")),
    )
    op.create_index(op.f("ix_checkpoint_person_key"), "checkpoint", ["person_key"], unique=False)
    op.create_table(
        "conclusion_signature",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("conclusion", sa.Integer(), nullable=False),
        sa.Column("person_key", sa.Integer(), nullable=False),
        sa.Column("meaning", sa.Text(), nullable=False),
        sa.Column("signer", sa.Text(), nullable=False),
        sa.Column("time", sa.Text(), nullable=False),
        sa.Column("signature", sa.LargeBinary(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint(
            "meaning IN ('prepared', 'reviewed', 'approved')", name=op.f("ck_conclusion_signature_meaning")
        ),
        sa.ForeignKeyConstraint(["conclusion"], ["conclusion.id"], name=op.f("fk_conclusion_signature_conclusion")),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_conclusion_signature_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["person_key"], ["person_key.id"], name=op.f("fk_conclusion_signature_person_key")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion_signature")),
    )
    op.create_index(op.f("ix_conclusion_signature_conclusion"), "conclusion_signature", ["conclusion"], unique=False)
    bind = op.get_bind()
    inspector = sa.inspect(bind)
    for table in ("person_key", "person_key_revocation", "checkpoint", "conclusion_signature"):
        others = sorted(unique["column_names"] for unique in inspector.get_unique_constraints(table))
        keys = [inspector.get_pk_constraint(table)["constrained_columns"], *others]
        for statement in guard(bind.dialect.name, table, keys):
            op.execute(statement)
