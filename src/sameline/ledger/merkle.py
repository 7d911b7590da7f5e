"""The Merkle tree of RFC 9162 section 2.1, over SHA-256.

Leaves and inner nodes are hashed in two domains (0x00 and 0x01), so that no leaf can be made that passes for a node.
A tree of n leaves splits at the largest power of two below n; hence the subtrees to its left are perfect, and the
tree is known by the perfect subtrees on its right edge: at most one a bit of n.

Perfect subtrees have addresses: (level, index) covers the leaves from index * 2**level, 2**level of them.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Sequence

from sameline.ledger.errors import LedgerError

HASH_SIZE = 32
"""Bytes of one hash."""

EMPTY_ROOT = hashlib.sha256(b"").digest()
"""The root of the tree without leaves: the hash of the empty string."""

Node = tuple[int, int, bytes]
"""A perfect subtree: level, index, hash."""


def leaf_hash(data: bytes) -> bytes:
    """The hash of a leaf: SHA-256 of 0x00 and the data."""
    return hashlib.sha256(b"\x00" + data).digest()


def leaf_hashes(data: Iterable[bytes]) -> list[bytes]:
    """`leaf_hash` of each."""
    sha256 = hashlib.sha256
    return [sha256(b"\x00" + leaf).digest() for leaf in data]


def node_hash(left: bytes, right: bytes) -> bytes:
    """The hash of an inner node: SHA-256 of 0x01 and its two children's hashes."""
    return hashlib.sha256(b"\x01" + left + right).digest()


def root(leaves: Sequence[bytes]) -> bytes:
    """The Merkle tree hash over leaves given by their hashes, in their order.

    Level by level; a last node without a neighbour goes up as it is, which is where the definition's
    unbalanced right subtree puts it.
    """
    level = list(leaves)
    if not level:
        return EMPTY_ROOT
    sha256 = hashlib.sha256
    while len(level) > 1:
        odd = level[-1:] if len(level) % 2 else []
        pairs = zip(level[::2], level[1::2], strict=False)
        level = [sha256(b"\x01" + left + right).digest() for left, right in pairs] + odd
    return level[0]


class Frontier:
    """A Merkle tree as it grows, kept as the perfect subtrees on its right edge: O(log n) memory.

    Args:
        size: leaves already in the tree.
        edge: the hashes of its perfect subtrees, the largest (leftmost) first: one a bit of `size`.

    Raises:
        LedgerError: the edge does not fit the size.
    """

    def __init__(self, size: int = 0, edge: Iterable[bytes] = ()) -> None:
        self._edge = list(edge)
        self._size = size
        if size < 0 or len(self._edge) != size.bit_count():
            raise LedgerError(f"a tree of {size} leaves does not have {len(self._edge)} subtrees on its edge")

    @property
    def size(self) -> int:
        """Leaves so far."""
        return self._size

    @property
    def edge(self) -> tuple[bytes, ...]:
        """The hashes of the perfect subtrees on the right edge, the largest first."""
        return tuple(self._edge)

    def add(self, leaf: bytes) -> list[Node]:
        """Append a leaf, given by its hash.

        Returns:
            The perfect subtrees that are now complete, the leaf itself (level 0) first.
        """
        index = self._size
        self._size = index + 1
        done = [(0, index, leaf)]
        level = 0
        while index & 1:
            leaf = hashlib.sha256(b"\x01" + self._edge.pop() + leaf).digest()
            level += 1
            index >>= 1
            done.append((level, index, leaf))
        self._edge.append(leaf)
        return done

    def root(self) -> bytes:
        """The Merkle tree hash of the leaves so far."""
        if not self._edge:
            return EMPTY_ROOT
        above = self._edge[-1]
        for left in reversed(self._edge[:-1]):
            above = node_hash(left, above)
        return above
