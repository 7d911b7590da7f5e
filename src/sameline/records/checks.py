"""The ledger checked against the rows: every finding, each with its table, row, entry and person.

The checks, by number:

1. The schema is the one the migrations made, and every table's refusing triggers are there.
2. Entries run from 1 without gaps, each names the one before by its digest, and each has its own digest.
3. The stored nodes of the ledger's tree are those of its entries.
4. Every row that an entry says it wrote is there, and no other.
5. Every row has the digest of its fields.
6. The rows of each entry have the Merkle root that the entry states.
7. Every reference leads to a row.

Recomputing the conclusions is the eighth check (`sameline.conclusions.recompute`); that no comparison was left behind
unseen, the ninth. The tenth is that the ledger still begins with the entries of each checkpoint that is recorded or
given, and that each is signed with its signer's registered key: only against one that was kept elsewhere can it be seen
that entries were cut off at the end, or all made anew. The eleventh is that each signature on a conclusion holds.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager

from sqlalchemy import Connection, inspect
from sqlalchemy.exc import DBAPIError

from sameline.ledger.checkpoint import Checkpoint
from sameline.records import tables as t
from sameline.records.check_checkpoints import check_checkpoints, recorded_checkpoints
from sameline.records.check_entries import check_entries
from sameline.records.check_rows import CHUNK, TableCheck, check_references
from sameline.records.check_schema import check_schema
from sameline.records.conclusion_signatures import check_signatures
from sameline.records.findings import Finding, Findings, LedgerReport, Progress

__all__ = ["Finding", "LedgerReport", "check_ledger"]


def check_ledger(
    connection: Connection,
    progress: Progress = lambda _done, _all: None,
    checkpoints: Sequence[Checkpoint] = (),
    since: Checkpoint | None = None,
) -> LedgerReport:
    """Check the whole ledger against the rows.

    Args:
        connection: a connection that sees the store.
        progress: told now and then how far it is.
        checkpoints: statements of the ledger as it was, kept elsewhere.
        since: one of them; the rows of the entries that it covers are taken as checked before. The entries are checked
            all the same, for they are what it states.
    """
    given = checkpoints if since is None or since in checkpoints else (*checkpoints, since)
    covered = since.entries if since else 0
    findings = Findings()
    with _odd_text(connection):
        present = set(inspect(connection).get_table_names())
        check_schema(connection, findings)
        if not present >= _NEEDED:
            return LedgerReport(0, 0, "", tuple(findings.all))  # without these there is nothing to check against
        recorded = recorded_checkpoints(connection, findings)
        said = check_entries(connection, findings, frozenset(c.entries for c in (*given, *recorded)))
        count = _Count(
            sum(span.count for spans in said.spans.values() for span in spans if span.entry > covered), progress
        )
        for table in t.recorded_tables():
            with _unreadable(findings, table.name):
                spans = said.spans.pop(table.name, [])
                start = max((span.end for span in spans if span.entry <= covered), default=0)
                check = TableCheck(connection, findings, table, count.one, start)
                check.run([span for span in spans if span.entry > covered])
        for name, left in said.spans.items():
            for span in left:
                findings.add(4, f"the entry wrote to {name}, which is no table of a store", None, None, span.entry)
        check_references(connection, findings)
        check_checkpoints(connection, findings, said, given, recorded)
        with _unreadable(findings, "conclusion_signature"):
            check_signatures(connection, findings)
    in_order = tuple(sorted(findings.all, key=lambda f: f.check))
    return LedgerReport(said.last, count.done, said.root.hex(), in_order)


_NEEDED = frozenset({"entry", "person", "tree_node", "laboratory", "person_key", "person_key_revocation", "checkpoint"})


class _Count:
    """Rows checked so far, told now and then."""

    def __init__(self, expected: int, progress: Progress) -> None:
        self.done = 0
        self._expected = expected
        self._progress = progress

    def one(self) -> None:
        self.done += 1
        if self.done % CHUNK == 0:
            self._progress(self.done, self._expected)


@contextmanager
def _unreadable(findings: Findings, table: str) -> Iterator[None]:
    """A table that cannot be read is a finding, and the next is checked."""
    try:
        yield
    except DBAPIError as error:
        findings.add(4, f"its rows cannot be read: {str(error.orig).splitlines()[0]}", table)


@contextmanager
def _odd_text(connection: Connection) -> Iterator[None]:
    """Bytes that are no text must be found, not stumbled over."""
    if connection.dialect.name != "sqlite":
        yield
        return
    raw = connection.connection.dbapi_connection
    usual = raw.text_factory  # type: ignore[union-attr]
    raw.text_factory = _any_text  # type: ignore[union-attr]
    try:
        yield
    finally:
        raw.text_factory = usual  # type: ignore[union-attr]


def _any_text(stored: bytes) -> str:
    return stored.decode(errors="surrogateescape")
