"""The tables of a store, as SQLAlchemy Core sees them.

Every table is insert only (the migrations install triggers that refuse anything else). Every row has an `id`, counted
from 1 without gaps within its table, the `entry` that wrote it, and the `digest` of its canonical form. A correction
is a new row that refers to the old one: a registered thing has one identity row and as many rows of particulars as
there were changes, of which the last recorded holds.

Truth values are 0 or 1 and moments are text (UTC, ISO 8601), so that a row reads the same, and hashes the same, from
SQLite and from PostgreSQL.
"""

from __future__ import annotations

from sqlalchemy import (
    CheckConstraint,
    Column,
    Float,
    ForeignKey,
    Index,
    Integer,
    LargeBinary,
    Table,
    Text,
    UniqueConstraint,
)

from sameline.records import table_parts
from sameline.records.table_parts import one_of, recorded, to

metadata = table_parts.metadata
"""All tables of a store."""

# -- the ledger ---------------------------------------------------------------------------------------------------

entry = Table(
    "entry",
    metadata,
    Column("number", Integer, primary_key=True, autoincrement=False),
    Column("at", Text, nullable=False),
    Column("person", Integer, ForeignKey("person.id", deferrable=True, initially="DEFERRED"), nullable=False),
    Column("act", Text, nullable=False),
    Column("reason", Text),
    Column("rows", Text, nullable=False),  # for each table: first id, count, Merkle root of the rows (canonical JSON)
    Column("prior", LargeBinary),  # digest of the entry before, none for the first
    Column("software", Text, nullable=False),
    Column("digest", LargeBinary, nullable=False),
    Index(None, "person", "number"),
    Index(None, "at"),
)

# The perfect subtrees of the ledger's Merkle tree, derived from the entries: an append and a proof read O(log n).
tree_node = Table(
    "tree_node",
    metadata,
    Column("level", Integer, primary_key=True, autoincrement=False),
    Column("position", Integer, primary_key=True, autoincrement=False),
    Column("hash", LargeBinary, nullable=False),
)

# -- what is registered -------------------------------------------------------------------------------------------

laboratory = recorded("laboratory", Column("name", Text, nullable=False), Column("zone", Text, nullable=False))

# Entries name persons, so this table alone names its entry without a constraint: two tables cannot both come first.
person = Table(
    "person",
    metadata,
    Column("id", Integer, primary_key=True, autoincrement=False),
    Column("entry", Integer, nullable=False),
    Column("code", Text, nullable=False, unique=True),
    Column("digest", LargeBinary, nullable=False),
)
person_particulars = recorded(
    "person_particulars",
    Column("person", Integer, to("person.id"), nullable=False, index=True),
    Column("name", Text, nullable=False),
    Column("role", Text),
)

supplier = recorded("supplier", Column("code", Text, nullable=False, unique=True))
supplier_particulars = recorded(
    "supplier_particulars",
    Column("supplier", Integer, to("supplier.id"), nullable=False, index=True),
    Column("name", Text, nullable=False),
    Column("note", Text),
)

material = recorded("material", Column("code", Text, nullable=False, unique=True))
material_particulars = recorded(
    "material_particulars",
    Column("material", Integer, to("material.id"), nullable=False, index=True),
    Column("name", Text, nullable=False),
    Column("note", Text),
)

instrument = recorded("instrument", Column("code", Text, nullable=False, unique=True))
instrument_particulars = recorded(
    "instrument_particulars",
    Column("instrument", Integer, to("instrument.id"), nullable=False, index=True),
    Column("name", Text, nullable=False),
    Column("note", Text),
)

batch = recorded("batch", Column("code", Text, nullable=False, unique=True))
batch_particulars = recorded(
    "batch_particulars",
    Column("batch", Integer, to("batch.id"), nullable=False, index=True),
    Column("material", Integer, to("material.id"), nullable=False, index=True),
    Column("supplier", Integer, to("supplier.id"), nullable=False, index=True),
    Column("supplier_lot", Text),
    Column("received", Text),
    Column("note", Text),
)

# The unit belongs to the identity: values already recorded are in it.
characteristic = recorded(
    "characteristic", Column("code", Text, nullable=False, unique=True), Column("unit", Text, nullable=False)
)
characteristic_particulars = recorded(
    "characteristic_particulars",
    Column("characteristic", Integer, to("characteristic.id"), nullable=False, index=True),
    Column("name", Text, nullable=False),
    Column("method", Text),
    Column("lower", Float(53)),
    Column("upper", Float(53)),
    Column("target", Float(53)),
    Column("margin", Float(53)),
    Column("decimals", Integer),
    Column("safety_critical", Integer, nullable=False),
    Column("note", Text),
    CheckConstraint("safety_critical IN (0, 1)", name="truth"),
    CheckConstraint("lower IS NULL OR upper IS NULL OR lower < upper", name="limits"),
    CheckConstraint("margin IS NULL OR margin > 0", name="margin"),
)

# -- what was tested ----------------------------------------------------------------------------------------------

source_file = recorded(
    "source_file",
    Column("name", Text, nullable=False),
    Column("sha256", Text, nullable=False, index=True),
    Column("size", Integer, nullable=False),
)

# How files of one kind are read; of several under one name the last holds.
heading_map = recorded("heading_map", Column("name", Text, nullable=False), Column("form", Text, nullable=False))

run = recorded(
    "run",
    Column("batch", Integer, to("batch.id"), nullable=False),
    Column("characteristic", Integer, to("characteristic.id"), nullable=False),
    Column("tested_at", Text, nullable=False),
    Column("analyst", Integer, to("person.id")),
    Column("instrument", Integer, to("instrument.id"), index=True),
    Column("session", Text),
    Column("note", Text),
    Column("source_file", Integer, to("source_file.id"), index=True),
    Column("source_row", Integer),
    Index(None, "characteristic", "batch", "tested_at"),
    Index(None, "batch"),
)

measurement = recorded(
    "measurement",
    Column("run", Integer, to("run.id"), nullable=False),
    Column("replicate", Integer, nullable=False),
    Column("text", Text, nullable=False),
    Column("value", Float(53), nullable=False),
    Column("qualifier", Text),
    Column("unit", Text),
    UniqueConstraint("run", "replicate"),
    CheckConstraint("qualifier IN ('<', '>')", name="qualifier"),
)

# -- corrections: always with a reason, which stands in the entry -------------------------------------------------

measurement_amendment = recorded(
    "measurement_amendment",
    Column("measurement", Integer, to("measurement.id"), nullable=False, index=True),
    Column("text", Text, nullable=False),
    Column("value", Float(53), nullable=False),
    Column("qualifier", Text),
    Column("unit", Text),
    CheckConstraint("qualifier IN ('<', '>')", name="qualifier"),
)

run_amendment = recorded(
    "run_amendment",
    Column("run", Integer, to("run.id"), nullable=False, index=True),
    Column("batch", Integer, to("batch.id"), nullable=False, index=True),
    Column("tested_at", Text, nullable=False),
    Column("analyst", Integer, to("person.id")),
    Column("instrument", Integer, to("instrument.id")),
    Column("session", Text),
    Column("note", Text),
)

exclusion = recorded(
    "exclusion",
    Column("measurement", Integer, to("measurement.id"), index=True),
    Column("run", Integer, to("run.id"), index=True),
    Column("batch", Integer, to("batch.id"), index=True),
    Column("cause", Text, nullable=False),
    one_of("measurement", "run", "batch"),
)

restoration = recorded("restoration", Column("exclusion", Integer, to("exclusion.id"), nullable=False, unique=True))

# -- what is asked ------------------------------------------------------------------------------------------------

comparison = recorded("comparison", Column("name", Text, nullable=False, unique=True))

comparison_revision = recorded(
    "comparison_revision",
    Column("comparison", Integer, to("comparison.id"), nullable=False),
    Column("revision", Integer, nullable=False),
    Column("characteristic", Integer, to("characteristic.id"), nullable=False, index=True),
    Column("grouping", Text, nullable=False),
    Column("listed", Integer, nullable=False),  # whether its groups are listed by name (comparison_group)
    Column("of_material", Integer, to("material.id")),
    Column("of_supplier", Integer, to("supplier.id")),
    Column("tested_from", Text),
    Column("model", Text, nullable=False),
    Column("procedure", Text, nullable=False),
    Column("unit", Text, nullable=False),
    Column("alpha", Float(53), nullable=False),
    Column("alternative", Text, nullable=False),
    Column("margin", Float(53)),
    Column("control_batch", Integer, to("batch.id")),
    Column("control_material", Integer, to("material.id")),
    Column("control_supplier", Integer, to("supplier.id")),
    Column("looks", Text, nullable=False),
    Column("final_units", Integer),
    Column("spending", Text),
    Column("known_spread", Integer),  # 1 where the run-to-run spread of other batches may be used
    Column("sessions", Integer),  # 1 where what the batches of one session share is taken out of their differences
    Column("window_units", Integer),  # evidence also starts anew every so many units,
    Column("window_months", Integer),  # or every so many calendar months from the month of the statement
    UniqueConstraint("comparison", "revision"),
    CheckConstraint("grouping IN ('batch', 'material', 'supplier')", name="grouping"),
    CheckConstraint("listed IN (0, 1) AND known_spread IN (0, 1) AND sessions IN (0, 1)", name="truth"),
    CheckConstraint("alpha > 0 AND alpha < 1", name="alpha"),
)

# The groups of a revision whose groups were listed by name; any other takes all that pass its filter.
comparison_group = recorded(
    "comparison_group",
    Column("revision", Integer, to("comparison_revision.id"), nullable=False, index=True),
    Column("place", Integer, nullable=False),
    Column("batch", Integer, to("batch.id"), index=True),
    Column("material", Integer, to("material.id")),
    Column("supplier", Integer, to("supplier.id")),
    one_of("batch", "material", "supplier"),
)

# An act that changed what a comparison rests on: until a conclusion has read that far, the comparison is behind.
comparison_touch = recorded(
    "comparison_touch",
    Column("comparison", Integer, to("comparison.id"), nullable=False),
    Index(None, "comparison", "entry"),
)

# -- what is answered ---------------------------------------------------------------------------------------------

conclusion = recorded(
    "conclusion",
    Column("comparison", Integer, to("comparison.id"), nullable=False),
    Column("version", Integer, nullable=False),
    Column("revision", Integer, to("comparison_revision.id"), nullable=False),
    Column("position", Integer, to("entry.number"), nullable=False),  # the ledger position that it read
    Column("look", Integer, nullable=False),
    Column("inputs", LargeBinary, nullable=False),  # digest of the values it was computed from
    Column("state", Text, nullable=False),
    Column("reason", Text),
    Column("runs", Integer, nullable=False),
    Column("replicates", Integer, nullable=False),
    Column("runs_before_statement", Integer, nullable=False),
    Column("display", Text, nullable=False),
    Column("test", Text),
    Column("statistic", Float(53)),
    Column("df_between", Float(53)),
    Column("df_within", Float(53)),
    Column("p_value", Float(53)),
    Column("critical_value", Float(53)),
    Column("guarantee", Text),  # what the error rate over all looks rests on
    Column("looks_state", Text),  # what the next look must remember (canonical JSON)
    Column("engine", Text, nullable=False),
    UniqueConstraint("comparison", "version"),
    CheckConstraint("state IN ('answered', 'not computed')", name="state"),
)

conclusion_cause = recorded(
    "conclusion_cause",
    Column("conclusion", Integer, to("conclusion.id"), nullable=False, index=True),
    Column("cause", Integer, to("entry.number"), nullable=False, index=True),
)

conclusion_group = recorded(
    "conclusion_group",
    Column("conclusion", Integer, to("conclusion.id"), nullable=False, index=True),
    Column("place", Integer, nullable=False),
    Column("batch", Integer, to("batch.id")),
    Column("material", Integer, to("material.id")),
    Column("supplier", Integer, to("supplier.id")),
    Column("units", Integer, nullable=False),
    Column("runs", Integer, nullable=False),
    Column("replicates", Integer, nullable=False),
    Column("mean", Float(53)),
    Column("sd", Float(53)),
    Column("lower", Float(53)),
    Column("upper", Float(53)),
    Column("letters", Text, nullable=False),  # the lines it stands on, a letter each
    one_of("batch", "material", "supplier"),
)

conclusion_pair = recorded(
    "conclusion_pair",
    Column("conclusion", Integer, to("conclusion.id"), nullable=False, index=True),
    Column("a", Integer, to("conclusion_group.id"), nullable=False),
    Column("b", Integer, to("conclusion_group.id"), nullable=False),
    Column("difference", Float(53)),
    Column("standard_error", Float(53)),
    Column("df", Float(53)),
    Column("statistic", Float(53)),
    Column("p_value", Float(53)),
    Column("lower", Float(53)),
    Column("upper", Float(53)),
    Column("differs", Integer),
    Column("verdict", Text, nullable=False),
    Column("reason", Text),  # why the pair cannot be judged, if it cannot
    Column("single_look_p", Float(53)),
    Column("p_now", Float(53)),  # overall p-value of this look's data alone
    Column("log_evidence", Float(53)),
    Column("share", Float(53)),  # of the error rate that its interval spends
    CheckConstraint(
        "verdict IN ('differs and matters', 'differs', 'equivalent', 'undecided')",
        name="verdict",
    ),
)

conclusion_component = recorded(
    "conclusion_component",
    Column("conclusion", Integer, to("conclusion.id"), nullable=False, index=True),
    Column("level", Text, nullable=False),
    Column("variance", Float(53), nullable=False),
    Column("lower", Float(53)),
    Column("upper", Float(53)),
)

conclusion_caution = recorded(
    "conclusion_caution",
    Column("conclusion", Integer, to("conclusion.id"), nullable=False, index=True),
    Column("code", Text, nullable=False),
    Column("text", Text, nullable=False),
)

conclusion_turn = recorded(
    "conclusion_turn",
    Column("conclusion", Integer, to("conclusion.id"), nullable=False, index=True),
    Column("pair", Integer, to("conclusion_pair.id"), nullable=False),
    Column("before", Text),  # the verdict in the version before, none where the pair is new
    Column("because", Text, nullable=False),
)

# -- who signs ----------------------------------------------------------------------------------------------------

person_key = recorded(
    "person_key",
    Column("person", Integer, to("person.id"), nullable=False, index=True),
    Column("public", LargeBinary, nullable=False, unique=True),  # the 32 bytes of an Ed25519 public key
)

# A key that is lost, retired or in the wrong hands; what it signed before this entry stands.
person_key_revocation = recorded(
    "person_key_revocation", Column("person_key", Integer, to("person_key.id"), nullable=False, unique=True)
)

# A signed statement of the ledger's size and root, as it was given away.
checkpoint = recorded(
    "checkpoint",
    Column("person_key", Integer, to("person_key.id"), nullable=False, index=True),
    Column("entries", Integer, nullable=False),
    Column("root", LargeBinary, nullable=False),
    Column("laboratory", Text, nullable=False),
    Column("signer", Text, nullable=False),
    Column("time", Text, nullable=False),
    Column("signature", LargeBinary, nullable=False),
)

# A person's signature with a meaning on one version of a conclusion: a later version does not carry it along.
conclusion_signature = recorded(
    "conclusion_signature",
    Column("conclusion", Integer, to("conclusion.id"), nullable=False, index=True),
    Column("person_key", Integer, to("person_key.id"), nullable=False),
    Column("meaning", Text, nullable=False),
    Column("signer", Text, nullable=False),
    Column("time", Text, nullable=False),
    Column("signature", LargeBinary, nullable=False),
    CheckConstraint("meaning IN ('prepared', 'reviewed', 'approved')", name="meaning"),
)


def recorded_tables() -> tuple[Table, ...]:
    """All tables of recorded rows (each with an id, an entry and a digest), in the order in which they depend."""
    return tuple(table for table in metadata.tables.values() if "digest" in table.columns and table is not entry)


def hashed_columns(table: Table) -> tuple[str, ...]:
    """The columns that a row's digest covers: all but the digest."""
    return tuple(column.name for column in table.columns if column.name != "digest")
