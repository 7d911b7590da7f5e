"""Checking a proof that somebody hands over: every check is made and every finding reported, as a numbered list."""

from __future__ import annotations

from collections.abc import Callable, Collection
from dataclasses import dataclass
from typing import TypeVar

from sameline.ledger.checkpoint import Checkpoint, verify_checkpoint
from sameline.ledger.errors import FormatError, LedgerError, ProofError
from sameline.ledger.manifest import TableRows, parse_manifest
from sameline.ledger.merkle import leaf_hash
from sameline.ledger.proof_files import ExtensionProof, RowProof
from sameline.ledger.proofs import verify_consistency, verify_inclusion
from sameline.ledger.rows import parse_row

_T = TypeVar("_T")


@dataclass(frozen=True, slots=True)
class Check:
    """One check and its outcome.

    Attributes:
        number: its place in the list, from 1.
        what: what was checked, as a statement that holds where there is no finding.
        finding: why it does not hold, or None.
    """

    number: int
    what: str
    finding: str | None = None

    @property
    def holds(self) -> bool:
        """Whether there is no finding."""
        return self.finding is None


def check_row_proof(proof: RowProof, keys: Collection[bytes] | None = None) -> list[Check]:
    """Check that a row, or an entry, is in the ledger of a checkpoint.

    Args:
        proof: as made or read.
        keys: the public keys accepted under the checkpoint; None accepts the one in it.

    Returns:
        Every check in order; the proof holds if all do.
    """
    checks = _Checks()
    entry = checks.make("the entry reads as one", lambda: _entry_fields(proof.entry))
    if proof.row is not None:
        _check_row(checks, proof, proof.row, entry)
    checks.make("the entry is in the ledger", lambda: _check_entry_path(proof, entry))
    checks.make("the checkpoint's signature holds", lambda: verify_checkpoint(proof.checkpoint, keys))
    return checks.made


def check_extension_proof(proof: ExtensionProof, keys: Collection[bytes] | None = None) -> list[Check]:
    """Check that the ledger of a later checkpoint begins with the ledger of an earlier one.

    Args:
        proof: as made or read.
        keys: the public keys accepted under the checkpoints; None accepts those in them.

    Returns:
        Every check in order; the proof holds if all do.
    """
    earlier, later = proof.earlier, proof.later
    checks = _Checks()
    checks.make("both checkpoints are of one laboratory", lambda: _check_same_laboratory(earlier, later))
    checks.make("the earlier checkpoint was signed first", lambda: _check_times(earlier, later))
    checks.make(
        "the later ledger begins with the earlier one",
        lambda: verify_consistency(earlier.entries, later.entries, proof.path, earlier.root, later.root),
    )
    checks.make("the earlier checkpoint's signature holds", lambda: verify_checkpoint(earlier, keys))
    checks.make("the later checkpoint's signature holds", lambda: verify_checkpoint(later, keys))
    return checks.made


class _Checks:
    """The checks made so far, numbered."""

    def __init__(self) -> None:
        self.made: list[Check] = []

    def make(self, what: str, check: Callable[[], _T]) -> _T | None:
        """Make a check; what it returns, or None where it has a finding."""
        result, finding = None, None
        try:
            result = check()
        except LedgerError as error:
            finding = str(error)
        self.made.append(Check(len(self.made) + 1, what, finding))
        return result


@dataclass(frozen=True, slots=True)
class _Entry:
    number: int
    rows: list[TableRows]


def _entry_fields(data: bytes) -> _Entry:
    table, fields = parse_row(data)
    number, rows = fields.get("number"), fields.get("rows")
    if table != "entry" or type(number) is not int or number < 1 or not isinstance(rows, str):
        raise FormatError("not an entry: a row of table 'entry' with its number and the list of its rows")
    return _Entry(number, parse_manifest(rows))


def _check_row(checks: _Checks, proof: RowProof, data: bytes, entry: _Entry | None) -> None:
    row = checks.make("the row reads as one", lambda: parse_row(data))
    checks.make("the row names this entry as its own", lambda: _check_row_entry(row, entry))
    checks.make("the row is among those that the entry wrote", lambda: _check_row_path(proof, data, row, entry))


def _check_row_entry(row: tuple[str, dict[str, object]] | None, entry: _Entry | None) -> None:
    if row is None or entry is None:
        raise FormatError("cannot be told, since one of them does not read")
    stated = row[1].get("entry")
    if type(stated) is not int or stated != entry.number:
        raise ProofError("the row is of another entry", got=repr(stated), want=str(entry.number))


def _check_row_path(
    proof: RowProof, data: bytes, row: tuple[str, dict[str, object]] | None, entry: _Entry | None
) -> None:
    if row is None or entry is None:
        raise FormatError("cannot be told, since one of them does not read")
    table, fields = row
    number = fields.get("id")
    if type(number) is not int:
        raise ProofError("the row has no id")
    for part in entry.rows:
        if part.table == table:
            verify_inclusion(leaf_hash(data), number - part.first, part.count, proof.row_path, part.root)
            return
    raise ProofError(f"the entry wrote no row of table {table!r}")


def _check_entry_path(proof: RowProof, entry: _Entry | None) -> None:
    if entry is None:
        raise FormatError("cannot be told, since the entry does not read")
    checkpoint = proof.checkpoint
    leaf = leaf_hash(proof.entry)
    verify_inclusion(leaf, entry.number - 1, checkpoint.entries, proof.entry_path, checkpoint.root)


def _check_same_laboratory(earlier: Checkpoint, later: Checkpoint) -> None:
    if earlier.laboratory != later.laboratory:
        raise ProofError("they are of two laboratories", got=later.laboratory, want=earlier.laboratory)


def _check_times(earlier: Checkpoint, later: Checkpoint) -> None:
    if later.time < earlier.time:
        raise ProofError(
            "the later one is dated before", got=later.time.isoformat(), want=f"{earlier.time.isoformat()} or after"
        )
