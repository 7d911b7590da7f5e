"""The first schema."""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

from sameline.records.append_only import guard

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "person",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person")),
        sa.UniqueConstraint("code", name=op.f("uq_person_code")),
    )
    op.create_table(
        "tree_node",
        sa.Column("level", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("position", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("hash", sa.LargeBinary(), nullable=False),
        sa.PrimaryKeyConstraint("level", "position", name=op.f("pk_tree_node")),
    )
    op.create_table(
        "entry",
        sa.Column("number", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("at", sa.Text(), nullable=False),
        sa.Column("person", sa.Integer(), nullable=False),
        sa.Column("act", sa.Text(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=True),
        sa.Column("rows", sa.Text(), nullable=False),
        sa.Column("prior", sa.LargeBinary(), nullable=True),
        sa.Column("software", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["person"], ["person.id"], name=op.f("fk_entry_person"), initially="DEFERRED", deferrable=True
        ),
        sa.PrimaryKeyConstraint("number", name=op.f("pk_entry")),
    )
    op.create_index(op.f("ix_entry_at"), "entry", ["at"], unique=False)
    op.create_index(op.f("ix_entry_person_number"), "entry", ["person", "number"], unique=False)
    op.create_table(
        "batch",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_batch_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_batch")),
        sa.UniqueConstraint("code", name=op.f("uq_batch_code")),
    )
    op.create_table(
        "characteristic",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("unit", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_characteristic_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_characteristic")),
        sa.UniqueConstraint("code", name=op.f("uq_characteristic_code")),
    )
    op.create_table(
        "comparison",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_comparison_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_comparison")),
        sa.UniqueConstraint("name", name=op.f("uq_comparison_name")),
    )
    op.create_table(
        "instrument",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_instrument_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_instrument")),
        sa.UniqueConstraint("code", name=op.f("uq_instrument_code")),
    )
    op.create_table(
        "laboratory",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("zone", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_laboratory_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_laboratory")),
    )
    op.create_table(
        "material",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_material_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_material")),
        sa.UniqueConstraint("code", name=op.f("uq_material_code")),
    )
    op.create_table(
        "person_particulars",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("person", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("role", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_person_particulars_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["person"], ["person.id"], name=op.f("fk_person_particulars_person")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person_particulars")),
    )
    op.create_index(op.f("ix_person_particulars_person"), "person_particulars", ["person"], unique=False)
    op.create_table(
        "source_file",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("sha256", sa.Text(), nullable=False),
        sa.Column("size", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_source_file_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_source_file")),
    )
    op.create_index(op.f("ix_source_file_sha256"), "source_file", ["sha256"], unique=False)
    op.create_table(
        "supplier",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_supplier_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_supplier")),
        sa.UniqueConstraint("code", name=op.f("uq_supplier_code")),
    )
    op.create_table(
        "batch_particulars",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("batch", sa.Integer(), nullable=False),
        sa.Column("material", sa.Integer(), nullable=False),
        sa.Column("supplier", sa.Integer(), nullable=False),
        sa.Column("supplier_lot", sa.Text(), nullable=True),
        sa.Column("received", sa.Text(), nullable=True),
        sa.Column("note", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["batch"], ["batch.id"], name=op.f("fk_batch_particulars_batch")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_batch_particulars_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["material"], ["material.id"], name=op.f("fk_batch_particulars_material")),
        sa.ForeignKeyConstraint(["supplier"], ["supplier.id"], name=op.f("fk_batch_particulars_supplier")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_batch_particulars")),
    )
    op.create_index(op.f("ix_batch_particulars_batch"), "batch_particulars", ["batch"], unique=False)
    op.create_index(op.f("ix_batch_particulars_material"), "batch_particulars", ["material"], unique=False)
    op.create_index(op.f("ix_batch_particulars_supplier"), "batch_particulars", ["supplier"], unique=False)
    op.create_table(
        "characteristic_particulars",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("characteristic", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("method", sa.Text(), nullable=True),
        sa.Column("lower", sa.Float(precision=53), nullable=True),
        sa.Column("upper", sa.Float(precision=53), nullable=True),
        sa.Column("target", sa.Float(precision=53), nullable=True),
        sa.Column("margin", sa.Float(precision=53), nullable=True),
        sa.Column("decimals", sa.Integer(), nullable=True),
        sa.Column("safety_critical", sa.Integer(), nullable=False),
        sa.Column("note", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint(
            "lower IS NULL OR upper IS NULL OR lower < upper", name=op.f("ck_characteristic_particulars_limits")
        ),
        sa.CheckConstraint("margin IS NULL OR margin > 0", name=op.f("ck_characteristic_particulars_margin")),
        sa.CheckConstraint("safety_critical IN (0, 1)", name=op.f("ck_characteristic_particulars_truth")),
        sa.ForeignKeyConstraint(
            ["characteristic"], ["characteristic.id"], name=op.f("fk_characteristic_particulars_characteristic")
        ),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_characteristic_particulars_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_characteristic_particulars")),
    )
    op.create_index(
        op.f("ix_characteristic_particulars_characteristic"),
        "characteristic_particulars",
        ["characteristic"],
        unique=False,
    )
    op.create_table(
        "comparison_revision",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("comparison", sa.Integer(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("characteristic", sa.Integer(), nullable=False),
        sa.Column("grouping", sa.Text(), nullable=False),
        sa.Column("listed", sa.Integer(), nullable=False),
        sa.Column("of_material", sa.Integer(), nullable=True),
        sa.Column("of_supplier", sa.Integer(), nullable=True),
        sa.Column("tested_from", sa.Text(), nullable=True),
        sa.Column("model", sa.Text(), nullable=False),
        sa.Column("procedure", sa.Text(), nullable=False),
        sa.Column("unit", sa.Text(), nullable=False),
        sa.Column("alpha", sa.Float(precision=53), nullable=False),
        sa.Column("alternative", sa.Text(), nullable=False),
        sa.Column("margin", sa.Float(precision=53), nullable=True),
        sa.Column("control_batch", sa.Integer(), nullable=True),
        sa.Column("control_material", sa.Integer(), nullable=True),
        sa.Column("control_supplier", sa.Integer(), nullable=True),
        sa.Column("looks", sa.Text(), nullable=False),
        sa.Column("final_units", sa.Integer(), nullable=True),
        sa.Column("spending", sa.Text(), nullable=True),
        sa.Column("known_spread", sa.Integer(), nullable=True),
        sa.Column("sessions", sa.Integer(), nullable=True),
        sa.Column("window_units", sa.Integer(), nullable=True),
        sa.Column("window_months", sa.Integer(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint(
            "grouping IN ('batch', 'material', 'supplier')", name=op.f("ck_comparison_revision_grouping")
        ),
        sa.CheckConstraint("alpha > 0 AND alpha < 1", name=op.f("ck_comparison_revision_alpha")),
        sa.CheckConstraint(
            "listed IN (0, 1) AND known_spread IN (0, 1) AND sessions IN (0, 1)",
            name=op.f("ck_comparison_revision_truth"),
        ),
        sa.ForeignKeyConstraint(
            ["characteristic"], ["characteristic.id"], name=op.f("fk_comparison_revision_characteristic")
        ),
        sa.ForeignKeyConstraint(["comparison"], ["comparison.id"], name=op.f("fk_comparison_revision_comparison")),
        sa.ForeignKeyConstraint(["control_batch"], ["batch.id"], name=op.f("fk_comparison_revision_control_batch")),
        sa.ForeignKeyConstraint(
            ["control_material"], ["material.id"], name=op.f("fk_comparison_revision_control_material")
        ),
        sa.ForeignKeyConstraint(
            ["control_supplier"], ["supplier.id"], name=op.f("fk_comparison_revision_control_supplier")
        ),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_comparison_revision_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["of_material"], ["material.id"], name=op.f("fk_comparison_revision_of_material")),
        sa.ForeignKeyConstraint(["of_supplier"], ["supplier.id"], name=op.f("fk_comparison_revision_of_supplier")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_comparison_revision")),
        sa.UniqueConstraint("comparison", "revision", name=op.f("uq_comparison_revision_comparison_revision")),
    )
    op.create_index(
        op.f("ix_comparison_revision_characteristic"), "comparison_revision", ["characteristic"], unique=False
    )
    op.create_table(
        "comparison_touch",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("comparison", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["comparison"], ["comparison.id"], name=op.f("fk_comparison_touch_comparison")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_comparison_touch_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_comparison_touch")),
    )
    op.create_index(
        op.f("ix_comparison_touch_comparison_entry"), "comparison_touch", ["comparison", "entry"], unique=False
    )
    op.create_table(
        "instrument_particulars",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("instrument", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("note", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_instrument_particulars_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["instrument"], ["instrument.id"], name=op.f("fk_instrument_particulars_instrument")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_instrument_particulars")),
    )
    op.create_index(
        op.f("ix_instrument_particulars_instrument"), "instrument_particulars", ["instrument"], unique=False
    )
    op.create_table(
        "material_particulars",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("material", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("note", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_material_particulars_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["material"], ["material.id"], name=op.f("fk_material_particulars_material")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_material_particulars")),
    )
    op.create_index(op.f("ix_material_particulars_material"), "material_particulars", ["material"], unique=False)
    op.create_table(
        "run",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("batch", sa.Integer(), nullable=False),
        sa.Column("characteristic", sa.Integer(), nullable=False),
        sa.Column("tested_at", sa.Text(), nullable=False),
        sa.Column("analyst", sa.Integer(), nullable=True),
        sa.Column("instrument", sa.Integer(), nullable=True),
        sa.Column("session", sa.Text(), nullable=True),
        sa.Column("note", sa.Text(), nullable=True),
        sa.Column("source_file", sa.Integer(), nullable=True),
        sa.Column("source_row", sa.Integer(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["analyst"], ["person.id"], name=op.f("fk_run_analyst")),
        sa.ForeignKeyConstraint(["batch"], ["batch.id"], name=op.f("fk_run_batch")),
        sa.ForeignKeyConstraint(["characteristic"], ["characteristic.id"], name=op.f("fk_run_characteristic")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_run_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["instrument"], ["instrument.id"], name=op.f("fk_run_instrument")),
        sa.ForeignKeyConstraint(["source_file"], ["source_file.id"], name=op.f("fk_run_source_file")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_run")),
    )
    op.create_index(op.f("ix_run_batch"), "run", ["batch"], unique=False)
    op.create_index(
        op.f("ix_run_characteristic_batch_tested_at"), "run", ["characteristic", "batch", "tested_at"], unique=False
    )
    op.create_index(op.f("ix_run_instrument"), "run", ["instrument"], unique=False)
    op.create_index(op.f("ix_run_source_file"), "run", ["source_file"], unique=False)
    op.create_table(
        "supplier_particulars",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("supplier", sa.Integer(), nullable=False),
        sa.Column("name", sa.Text(), nullable=False),
        sa.Column("note", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_supplier_particulars_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["supplier"], ["supplier.id"], name=op.f("fk_supplier_particulars_supplier")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_supplier_particulars")),
    )
    op.create_index(op.f("ix_supplier_particulars_supplier"), "supplier_particulars", ["supplier"], unique=False)
    op.create_table(
        "comparison_group",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("place", sa.Integer(), nullable=False),
        sa.Column("batch", sa.Integer(), nullable=True),
        sa.Column("material", sa.Integer(), nullable=True),
        sa.Column("supplier", sa.Integer(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint(
            "(CASE WHEN batch IS NULL THEN 0 ELSE 1 END) + (CASE WHEN material IS NULL THEN 0 ELSE 1 END) + (CASE WHEN supplier IS NULL THEN 0 ELSE 1 END) = 1",
            name=op.f("ck_comparison_group_exactly_one"),
        ),
        sa.ForeignKeyConstraint(["batch"], ["batch.id"], name=op.f("fk_comparison_group_batch")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_comparison_group_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["material"], ["material.id"], name=op.f("fk_comparison_group_material")),
        sa.ForeignKeyConstraint(["revision"], ["comparison_revision.id"], name=op.f("fk_comparison_group_revision")),
        sa.ForeignKeyConstraint(["supplier"], ["supplier.id"], name=op.f("fk_comparison_group_supplier")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_comparison_group")),
    )
    op.create_index(op.f("ix_comparison_group_batch"), "comparison_group", ["batch"], unique=False)
    op.create_index(op.f("ix_comparison_group_revision"), "comparison_group", ["revision"], unique=False)
    op.create_table(
        "conclusion",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("comparison", sa.Integer(), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("position", sa.Integer(), nullable=False),
        sa.Column("look", sa.Integer(), nullable=False),
        sa.Column("inputs", sa.LargeBinary(), nullable=False),
        sa.Column("state", sa.Text(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=True),
        sa.Column("runs", sa.Integer(), nullable=False),
        sa.Column("replicates", sa.Integer(), nullable=False),
        sa.Column("runs_before_statement", sa.Integer(), nullable=False),
        sa.Column("display", sa.Text(), nullable=False),
        sa.Column("test", sa.Text(), nullable=True),
        sa.Column("statistic", sa.Float(precision=53), nullable=True),
        sa.Column("df_between", sa.Float(precision=53), nullable=True),
        sa.Column("df_within", sa.Float(precision=53), nullable=True),
        sa.Column("p_value", sa.Float(precision=53), nullable=True),
        sa.Column("critical_value", sa.Float(precision=53), nullable=True),
        sa.Column("guarantee", sa.Text(), nullable=True),
        sa.Column("looks_state", sa.Text(), nullable=True),
        sa.Column("engine", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint("state IN ('answered', 'not computed')", name=op.f("ck_conclusion_state")),
        sa.ForeignKeyConstraint(["comparison"], ["comparison.id"], name=op.f("fk_conclusion_comparison")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_conclusion_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["position"], ["entry.number"], name=op.f("fk_conclusion_position")),
        sa.ForeignKeyConstraint(["revision"], ["comparison_revision.id"], name=op.f("fk_conclusion_revision")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion")),
        sa.UniqueConstraint("comparison", "version", name=op.f("uq_conclusion_comparison_version")),
    )
    op.create_table(
        "measurement",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("run", sa.Integer(), nullable=False),
        sa.Column("replicate", sa.Integer(), nullable=False),
        sa.Column("text", sa.Text(), nullable=False),
        sa.Column("value", sa.Float(precision=53), nullable=False),
        sa.Column("qualifier", sa.Text(), nullable=True),
        sa.Column("unit", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint("qualifier IN ('<', '>')", name=op.f("ck_measurement_qualifier")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_measurement_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["run"], ["run.id"], name=op.f("fk_measurement_run")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_measurement")),
        sa.UniqueConstraint("run", "replicate", name=op.f("uq_measurement_run_replicate")),
    )
    op.create_table(
        "run_amendment",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("run", sa.Integer(), nullable=False),
        sa.Column("batch", sa.Integer(), nullable=False),
        sa.Column("tested_at", sa.Text(), nullable=False),
        sa.Column("analyst", sa.Integer(), nullable=True),
        sa.Column("instrument", sa.Integer(), nullable=True),
        sa.Column("session", sa.Text(), nullable=True),
        sa.Column("note", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["analyst"], ["person.id"], name=op.f("fk_run_amendment_analyst")),
        sa.ForeignKeyConstraint(["batch"], ["batch.id"], name=op.f("fk_run_amendment_batch")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_run_amendment_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["instrument"], ["instrument.id"], name=op.f("fk_run_amendment_instrument")),
        sa.ForeignKeyConstraint(["run"], ["run.id"], name=op.f("fk_run_amendment_run")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_run_amendment")),
    )
    op.create_index(op.f("ix_run_amendment_batch"), "run_amendment", ["batch"], unique=False)
    op.create_index(op.f("ix_run_amendment_run"), "run_amendment", ["run"], unique=False)
    op.create_table(
        "conclusion_cause",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("conclusion", sa.Integer(), nullable=False),
        sa.Column("cause", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["cause"], ["entry.number"], name=op.f("fk_conclusion_cause_cause")),
        sa.ForeignKeyConstraint(["conclusion"], ["conclusion.id"], name=op.f("fk_conclusion_cause_conclusion")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_conclusion_cause_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion_cause")),
    )
    op.create_index(op.f("ix_conclusion_cause_cause"), "conclusion_cause", ["cause"], unique=False)
    op.create_index(op.f("ix_conclusion_cause_conclusion"), "conclusion_cause", ["conclusion"], unique=False)
    op.create_table(
        "conclusion_caution",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("conclusion", sa.Integer(), nullable=False),
        sa.Column("code", sa.Text(), nullable=False),
        sa.Column("text", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["conclusion"], ["conclusion.id"], name=op.f("fk_conclusion_caution_conclusion")),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_conclusion_caution_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion_caution")),
    )
    op.create_index(op.f("ix_conclusion_caution_conclusion"), "conclusion_caution", ["conclusion"], unique=False)
    op.create_table(
        "conclusion_component",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("conclusion", sa.Integer(), nullable=False),
        sa.Column("level", sa.Text(), nullable=False),
        sa.Column("variance", sa.Float(precision=53), nullable=False),
        sa.Column("lower", sa.Float(precision=53), nullable=True),
        sa.Column("upper", sa.Float(precision=53), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["conclusion"], ["conclusion.id"], name=op.f("fk_conclusion_component_conclusion")),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_conclusion_component_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion_component")),
    )
    op.create_index(op.f("ix_conclusion_component_conclusion"), "conclusion_component", ["conclusion"], unique=False)
    op.create_table(
        "conclusion_group",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("conclusion", sa.Integer(), nullable=False),
        sa.Column("place", sa.Integer(), nullable=False),
        sa.Column("batch", sa.Integer(), nullable=True),
        sa.Column("material", sa.Integer(), nullable=True),
        sa.Column("supplier", sa.Integer(), nullable=True),
        sa.Column("units", sa.Integer(), nullable=False),
        sa.Column("runs", sa.Integer(), nullable=False),
        sa.Column("replicates", sa.Integer(), nullable=False),
        sa.Column("mean", sa.Float(precision=53), nullable=True),
        sa.Column("sd", sa.Float(precision=53), nullable=True),
        sa.Column("lower", sa.Float(precision=53), nullable=True),
        sa.Column("upper", sa.Float(precision=53), nullable=True),
        sa.Column("letters", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint(
            "(CASE WHEN batch IS NULL THEN 0 ELSE 1 END) + (CASE WHEN material IS NULL THEN 0 ELSE 1 END) + (CASE WHEN supplier IS NULL THEN 0 ELSE 1 END) = 1",
            name=op.f("ck_conclusion_group_exactly_one"),
        ),
        sa.ForeignKeyConstraint(["batch"], ["batch.id"], name=op.f("fk_conclusion_group_batch")),
        sa.ForeignKeyConstraint(["conclusion"], ["conclusion.id"], name=op.f("fk_conclusion_group_conclusion")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_conclusion_group_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["material"], ["material.id"], name=op.f("fk_conclusion_group_material")),
        sa.ForeignKeyConstraint(["supplier"], ["supplier.id"], name=op.f("fk_conclusion_group_supplier")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion_group")),
    )
    op.create_index(op.f("ix_conclusion_group_conclusion"), "conclusion_group", ["conclusion"], unique=False)
    op.create_table(
        "exclusion",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("measurement", sa.Integer(), nullable=True),
        sa.Column("run", sa.Integer(), nullable=True),
        sa.Column("batch", sa.Integer(), nullable=True),
        sa.Column("cause", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint(
            "(CASE WHEN measurement IS NULL THEN 0 ELSE 1 END) + (CASE WHEN run IS NULL THEN 0 ELSE 1 END) + (CASE WHEN batch IS NULL THEN 0 ELSE 1 END) = 1",
            name=op.f("ck_exclusion_exactly_one"),
        ),
        sa.ForeignKeyConstraint(["batch"], ["batch.id"], name=op.f("fk_exclusion_batch")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_exclusion_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["measurement"], ["measurement.id"], name=op.f("fk_exclusion_measurement")),
        sa.ForeignKeyConstraint(["run"], ["run.id"], name=op.f("fk_exclusion_run")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_exclusion")),
    )
    op.create_index(op.f("ix_exclusion_batch"), "exclusion", ["batch"], unique=False)
    op.create_index(op.f("ix_exclusion_measurement"), "exclusion", ["measurement"], unique=False)
    op.create_index(op.f("ix_exclusion_run"), "exclusion", ["run"], unique=False)
    op.create_table(
        "measurement_amendment",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("measurement", sa.Integer(), nullable=False),
        sa.Column("text", sa.Text(), nullable=False),
        sa.Column("value", sa.Float(precision=53), nullable=False),
        sa.Column("qualifier", sa.Text(), nullable=True),
        sa.Column("unit", sa.Text(), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint("qualifier IN ('<', '>')", name=op.f("ck_measurement_amendment_qualifier")),
        sa.ForeignKeyConstraint(
            ["entry"],
            ["entry.number"],
            name=op.f("fk_measurement_amendment_entry"),
            initially="IMMEDIATE",
            deferrable=True,
        ),
        sa.ForeignKeyConstraint(["measurement"], ["measurement.id"], name=op.f("fk_measurement_amendment_measurement")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_measurement_amendment")),
    )
    op.create_index(
        op.f("ix_measurement_amendment_measurement"), "measurement_amendment", ["measurement"], unique=False
    )
    op.create_table(
        "conclusion_pair",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("conclusion", sa.Integer(), nullable=False),
        sa.Column("a", sa.Integer(), nullable=False),
        sa.Column("b", sa.Integer(), nullable=False),
        sa.Column("difference", sa.Float(precision=53), nullable=True),
        sa.Column("standard_error", sa.Float(precision=53), nullable=True),
        sa.Column("df", sa.Float(precision=53), nullable=True),
        sa.Column("statistic", sa.Float(precision=53), nullable=True),
        sa.Column("p_value", sa.Float(precision=53), nullable=True),
        sa.Column("lower", sa.Float(precision=53), nullable=True),
        sa.Column("upper", sa.Float(precision=53), nullable=True),
        sa.Column("differs", sa.Integer(), nullable=True),
        sa.Column("verdict", sa.Text(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=True),
        sa.Column("single_look_p", sa.Float(precision=53), nullable=True),
        sa.Column("p_now", sa.Float(precision=53), nullable=True),
        sa.Column("log_evidence", sa.Float(precision=53), nullable=True),
        sa.Column("share", sa.Float(precision=53), nullable=True),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint(
            "verdict IN ('differs and matters', 'differs', 'equivalent', 'undecided')",
            name=op.f("ck_conclusion_pair_verdict"),
        ),
        sa.ForeignKeyConstraint(["a"], ["conclusion_group.id"], name=op.f("fk_conclusion_pair_a")),
        sa.ForeignKeyConstraint(["b"], ["conclusion_group.id"], name=op.f("fk_conclusion_pair_b")),
        sa.ForeignKeyConstraint(["conclusion"], ["conclusion.id"], name=op.f("fk_conclusion_pair_conclusion")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_conclusion_pair_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion_pair")),
    )
    op.create_index(op.f("ix_conclusion_pair_conclusion"), "conclusion_pair", ["conclusion"], unique=False)
    op.create_table(
        "restoration",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("exclusion", sa.Integer(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_restoration_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["exclusion"], ["exclusion.id"], name=op.f("fk_restoration_exclusion")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_restoration")),
        sa.UniqueConstraint("exclusion", name=op.f("uq_restoration_exclusion")),
    )
    op.create_table(
        "conclusion_turn",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("entry", sa.Integer(), nullable=False),
        sa.Column("conclusion", sa.Integer(), nullable=False),
        sa.Column("pair", sa.Integer(), nullable=False),
        sa.Column("before", sa.Text(), nullable=True),
        sa.Column("because", sa.Text(), nullable=False),
        sa.Column("digest", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["conclusion"], ["conclusion.id"], name=op.f("fk_conclusion_turn_conclusion")),
        sa.ForeignKeyConstraint(
            ["entry"], ["entry.number"], name=op.f("fk_conclusion_turn_entry"), initially="IMMEDIATE", deferrable=True
        ),
        sa.ForeignKeyConstraint(["pair"], ["conclusion_pair.id"], name=op.f("fk_conclusion_turn_pair")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_conclusion_turn")),
    )
    op.create_index(op.f("ix_conclusion_turn_conclusion"), "conclusion_turn", ["conclusion"], unique=False)
    bind = op.get_bind()
    inspector = sa.inspect(bind)
    for table in sorted(set(inspector.get_table_names()) - {"alembic_version"}):
        others = sorted(unique["column_names"] for unique in inspector.get_unique_constraints(table))
        keys = [inspector.get_pk_constraint(table)["constrained_columns"], *others]
        for statement in guard(bind.dialect.name, table, keys):
            op.execute(statement)
