"""Do the ledger's entries follow from each other, is their stored tree theirs, do they agree with the checkpoints?"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from sqlalchemy import Connection, select

from sameline.ledger.errors import FormatError
from sameline.ledger.manifest import parse_manifest
from sameline.ledger.merkle import Frontier
from sameline.records import tables as t
from sameline.records.check_rows import Digester, Span, every_row
from sameline.records.findings import Findings


@dataclass(slots=True)
class Entries:
    """What the entries say.

    Attributes:
        spans: table -> what each entry says it wrote to it.
        last: number of the last entry.
        root: Merkle root over all.
        roots: number of entries -> root over the first so many, where a checkpoint states one.
    """

    spans: dict[str, list[Span]] = field(default_factory=dict)
    last: int = 0
    root: bytes = b""
    roots: dict[int, bytes] = field(default_factory=dict)


def check_entries(connection: Connection, findings: Findings, sizes: frozenset[int]) -> Entries:
    """2 and 3. The chain of entries, and the stored nodes of their tree.

    Args:
        connection: sees the store.
        findings: takes what is found.
        sizes: the numbers of entries whose root is wanted.
    """
    columns = t.hashed_columns(t.entry)
    digest_of = Digester(t.entry)
    codes = {row.id: row.code for row in connection.execute(select(t.person.c.id, t.person.c.code))}
    nodes = _stored_nodes(connection)
    frontier, prior, said = Frontier(), None, Entries()
    for *values, digest in every_row(connection, t.entry, "number"):
        row = dict(zip(columns, values, strict=True))
        number = row["number"]
        if number > said.last + 1:
            findings.missing(2, "entry", said.last + 1, number - 1)
        said.last = number
        findings.people[number] = codes.get(row["person"], "nobody registered")
        if digest_of(values) != digest:
            findings.add(2, "its fields are not what its digest was made of", "entry", number, number)
        if row["prior"] != prior:
            findings.add(2, "it does not follow from the entry before it", "entry", number, number)
        prior = digest
        leaf = digest if isinstance(digest, bytes) else b""
        for level, position, node in frontier.add(leaf)[1:]:
            if nodes.pop((level, position), None) != node:
                problem = f"the tree's node at level {level}, position {position} is not the entries'"
                findings.add(3, problem, "tree_node", None, number)
        if frontier.size in sizes:
            said.roots[frontier.size] = frontier.root()
        _note_spans(findings, row, said.spans)
    for level, position in sorted(nodes, key=str):
        findings.add(
            3, f"the tree has a node at level {level}, position {position} that no entry completes", "tree_node"
        )
    said.root = frontier.root()
    return said


def _stored_nodes(connection: Connection) -> dict[tuple[Any, Any], Any]:
    node = t.tree_node
    rows = connection.execute(select(node.c.level, node.c.position, node.c.hash))
    return {(level, position): hash_ for level, position, hash_ in rows}


def _note_spans(findings: Findings, row: dict[str, Any], spans: dict[str, list[Span]]) -> None:
    number = row["number"]
    try:
        parts = parse_manifest(row["rows"]) if isinstance(row["rows"], str) else []
    except FormatError as error:
        findings.add(2, f"its list of the rows it wrote cannot be read: {error.message}", "entry", number, number)
        return
    for part in parts:
        spans.setdefault(part.table, []).append(Span(number, part.first, part.count, part.root))
