"""Inclusion and consistency proofs: RFC 9162 sections 2.1.3 and 2.1.4.

A proof is made from the hashes of perfect subtrees, which never change once complete: `node(level, index)` hands
them over, from a store or from a list of leaf hashes (`node_reader`). It is checked with nothing but the proof.
Sizes and the path's length are checked before anything is hashed. With the length known to be right, the walks below
need not shift past levels without a neighbour as the RFC's do: on the right edge fn equals sn, and stays equal.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from sameline.ledger.errors import LedgerError, ProofError
from sameline.ledger.merkle import EMPTY_ROOT, HASH_SIZE, node_hash, root

NodeReader = Callable[[int, int], bytes]
"""(level, index) -> the hash of that perfect subtree."""


def node_reader(leaves: Sequence[bytes]) -> NodeReader:
    """Hand over perfect subtrees from the hashes of all leaves, computing each when it is asked for."""

    def node(level: int, index: int) -> bytes:
        return root(leaves[index << level : (index + 1) << level])

    return node


def subtree(start: int, end: int, node: NodeReader) -> bytes:
    """The Merkle tree hash of the leaves start to end (end not included): D[start:end] in RFC 9162 section 2.1.1.

    `start` must be a multiple of the smallest power of two that is not below end - start, as it is for every subtree.
    """
    sizes = [1 << bit for bit in range((end - start).bit_length() - 1, -1, -1) if (end - start) >> bit & 1]
    hashes = []
    for size in sizes:
        hashes.append(node(size.bit_length() - 1, start // size))
        start += size
    if not hashes:
        return EMPTY_ROOT
    above = hashes[-1]
    for left in reversed(hashes[:-1]):
        above = node_hash(left, above)
    return above


def inclusion_path(index: int, size: int, node: NodeReader) -> list[bytes]:
    """PATH(index, D[size]) of RFC 9162 section 2.1.3.1, from the leaf upwards.

    Args:
        index: the leaf's place, from 0.
        size: leaves of the tree to prove against, which may be an earlier one.
        node: hands over the hash of a perfect subtree.

    Raises:
        LedgerError: there is no such leaf.
    """
    if not 0 <= index < size:
        raise LedgerError(f"a tree of {size} leaves has no leaf {index}")
    path: list[bytes] = []
    start, end = 0, size
    while end - start > 1:
        middle = start + _split(end - start)
        if index < middle:
            path.append(subtree(middle, end, node))
            end = middle
        else:
            path.append(subtree(start, middle, node))
            start = middle
    return path[::-1]


def consistency_path(old: int, new: int, node: NodeReader) -> list[bytes]:
    """PROOF(old, D[new]) of RFC 9162 section 2.1.4.1, from the bottom upwards.

    Args:
        old: leaves of the earlier tree.
        new: leaves of the later tree.
        node: hands over the hash of a perfect subtree of the later tree.

    Returns:
        The path; empty where old equals new, and where old is 0, which every tree extends.

    Raises:
        LedgerError: the later tree is the smaller one.
    """
    if not 0 <= old <= new:
        raise LedgerError(f"a tree of {new} leaves cannot extend one of {old}")
    if old in (0, new):
        return []
    path: list[bytes] = []
    start, end, whole = 0, new, True
    while end != old:
        middle = start + _split(end - start)
        if old <= middle:
            path.append(subtree(middle, end, node))
            end = middle
        else:
            path.append(subtree(start, middle, node))
            start, whole = middle, False
    if not whole:
        path.append(subtree(start, end, node))
    return path[::-1]


def verify_inclusion(leaf: bytes, index: int, size: int, path: Sequence[bytes], root_hash: bytes) -> None:
    """Check an inclusion proof: RFC 9162 section 2.1.3.2.

    The size is bound by what binds the root (a signed checkpoint): sizes under which the leaf's path has the same
    shape pass alike.

    Args:
        leaf: the leaf's hash.
        index: its place, from 0.
        size: leaves of the tree.
        path: the proof, from the leaf upwards.
        root_hash: the tree's root.

    Raises:
        ProofError: the proof does not hold; with what was computed and what was wanted.
    """
    if not 0 <= index < size:
        raise ProofError("the leaf is not within the tree", got=f"leaf {index}", want=f"below {size}")
    _check_lengths([leaf, root_hash, *path])
    inner = (index ^ (size - 1)).bit_length()
    _check_path_length(path, inner + (index >> inner).bit_count())
    fn, sn, r = index, size - 1, leaf
    for p in path:
        r = node_hash(p, r) if fn & 1 or fn == sn else node_hash(r, p)
        fn >>= 1
        sn >>= 1
    _check_root("the path does not lead to the tree's root", r, root_hash)


def verify_consistency(old: int, new: int, path: Sequence[bytes], old_root: bytes, new_root: bytes) -> None:
    """Check that one tree extends another: RFC 9162 section 2.1.4.2.

    Args:
        old: leaves of the earlier tree.
        new: leaves of the later tree.
        path: the proof.
        old_root: the earlier tree's root.
        new_root: the later tree's root.

    Raises:
        ProofError: the proof does not hold; with what was computed and what was wanted.
    """
    if not 0 <= old <= new:
        raise ProofError("the later tree is the smaller one", got=f"{new} leaves", want=f"at least {old}")
    _check_lengths([old_root, new_root, *path])
    if old in (0, new):
        _check_path_length(path, 0)
        _check_root("the earlier root is another one", old_root, new_root if old else EMPTY_ROOT)
        return
    trailing = (old & -old).bit_length() - 1
    inner = ((old - 1) ^ (new - 1)).bit_length() - trailing
    whole = old & (old - 1) == 0
    _check_path_length(path, inner + ((old - 1) >> (inner + trailing)).bit_count() + (not whole))
    _replay_consistency(old, new, [old_root, *path] if whole else path, old_root, new_root)


def _replay_consistency(old: int, new: int, path: Sequence[bytes], old_root: bytes, new_root: bytes) -> None:
    fn, sn = old - 1, new - 1
    while fn & 1:
        fn >>= 1
        sn >>= 1
    fr = sr = path[0]
    for c in path[1:]:
        if fn & 1 or fn == sn:
            fr = node_hash(c, fr)
            sr = node_hash(c, sr)
        else:
            sr = node_hash(sr, c)
        fn >>= 1
        sn >>= 1
    _check_root("the proof does not lead to the earlier root", fr, old_root)
    _check_root("the proof does not lead to the later root", sr, new_root)


def _split(size: int) -> int:
    """The largest power of two below the size: k in RFC 9162 section 2.1.1."""
    return 1 << ((size - 1).bit_length() - 1)


def _check_lengths(hashes: Sequence[bytes]) -> None:
    for value in hashes:
        if len(value) != HASH_SIZE:
            raise ProofError("a hash has the wrong length", got=f"{len(value)} bytes", want=f"{HASH_SIZE} bytes")


def _check_path_length(path: Sequence[bytes], want: int) -> None:
    if len(path) != want:
        raise ProofError("the proof has the wrong length", got=f"{len(path)} hashes", want=f"{want}")


def _check_root(message: str, got: bytes, want: bytes) -> None:
    if got != want:
        raise ProofError(message, got=got.hex(), want=want.hex())
