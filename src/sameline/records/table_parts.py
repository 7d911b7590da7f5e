"""What the tables of a store are made of: names for constraints, and the columns that every recorded row has."""

from __future__ import annotations

from typing import Any

from sqlalchemy import CheckConstraint, Column, ForeignKey, Integer, LargeBinary, MetaData, Table

metadata = MetaData(
    naming_convention={
        "ix": "ix_%(table_name)s_%(column_0_N_name)s",
        "uq": "uq_%(table_name)s_%(column_0_N_name)s",
        "ck": "ck_%(table_name)s_%(constraint_name)s",
        "fk": "fk_%(table_name)s_%(column_0_N_name)s",
        "pk": "pk_%(table_name)s",
    }
)


def to(target: str) -> ForeignKey:
    """A reference to a column of another table."""
    return ForeignKey(target)


def recorded(name: str, *parts: Any) -> Table:  # noqa: ANN401 - Column, Index or constraint, as Table takes them
    """A table of recorded rows: identity, entry, digest, and what it is about."""
    return Table(
        name,
        metadata,
        Column("id", Integer, primary_key=True, autoincrement=False),
        # deferrable, so that an act too large for memory may write its rows before its entry
        Column("entry", Integer, ForeignKey("entry.number", deferrable=True, initially="IMMEDIATE"), nullable=False),
        *parts,
        Column("digest", LargeBinary, nullable=False),
    )


def one_of(*columns: str) -> CheckConstraint:
    """Exactly one of these columns has a value."""
    filled = " + ".join(f"(CASE WHEN {column} IS NULL THEN 0 ELSE 1 END)" for column in columns)
    return CheckConstraint(f"{filled} = 1", name="exactly_one")
