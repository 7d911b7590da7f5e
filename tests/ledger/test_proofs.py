import itertools
from types import ModuleType

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.ledger.errors import LedgerError, ProofError
from sameline.ledger.merkle import EMPTY_ROOT, Frontier, leaf_hash, root
from sameline.ledger.proofs import (
    consistency_path,
    inclusion_path,
    node_reader,
    subtree,
    verify_consistency,
    verify_inclusion,
)

# The eight-leaf example of the Certificate Transparency reference implementation, from memory (see test_merkle).
EXAMPLE = ["", "00", "10", "2021", "3031", "40414243", "5051525354555657", "606162636465666768696a6b6c6d6e6f"]
N96 = "96a296d224f285c67bee93c30f8a309157f0daa35dc5b87e410b78630a09cfc7"
N5F = "5f083f0a1a33ca076a95279832580db3e0ef4584bdff1f54c8a360f50de3031e"
N6B = "6b47aaf29ee3c2af9af889bc1fb9254dabd31177f16232dd6aab035ca39bf6e4"
NBC = "bc1a0643b12e4d2d7c77918f44e0f4f79a838b6cf9ec5b5c283e1f4d88599e6b"
NCA = "ca854ea128ed050b41b35ffc1b87b8eb2bde461e9e3b5596ece6b9d5975a0ae0"
ND3 = "d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7"
N6E = "6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d"
N0E = "0ebc5d3437fbe2db158b9f126a1d118e308181031d0a949f8dededebc558ef6a"
NFA = "fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125"
INCLUSION = [(0, 8, [N96, N5F, N6B]), (5, 8, [NBC, NCA, ND3]), (2, 3, [NFA]), (1, 5, [N6E, N5F, NBC])]
CONSISTENCY = [(1, 8, [N96, N5F, N6B]), (6, 8, [N0E, NCA, ND3]), (2, 5, [N5F, NBC]), (1, 1, [])]


def tree(size: int):
    leaves = [f"leaf {i}".encode() for i in range(size)]
    return leaves, [leaf_hash(leaf) for leaf in leaves]


def stored_nodes(hashes: list[bytes]):
    """The perfect subtrees as a store keeps them while the tree grows."""
    frontier, kept = Frontier(), {}
    for leaf in hashes:
        kept.update({(level, index): value for level, index, value in frontier.add(leaf)})
    return lambda level, index: kept[level, index]


def flipped(data: bytes, bit: int):
    return (int.from_bytes(data, "big") ^ (1 << bit % 256)).to_bytes(32, "big")


@pytest.mark.parametrize(("index", "size", "path"), INCLUSION)
def test_inclusion_proofs_of_the_eight_leaf_example(index: int, size: int, path: list[str]):
    node = node_reader([leaf_hash(bytes.fromhex(leaf)) for leaf in EXAMPLE])
    assert [p.hex() for p in inclusion_path(index, size, node)] == path


@pytest.mark.parametrize(("old", "new", "path"), CONSISTENCY)
def test_consistency_proofs_of_the_eight_leaf_example(old: int, new: int, path: list[str]):
    node = node_reader([leaf_hash(bytes.fromhex(leaf)) for leaf in EXAMPLE])
    assert [p.hex() for p in consistency_path(old, new, node)] == path


@pytest.mark.parametrize("size", range(1, 65))
def test_every_inclusion_proof_to_64_leaves_equals_the_definition_and_verifies(size: int, definition: ModuleType):
    leaves, hashes = tree(size)
    node, top = stored_nodes(hashes), root(hashes)
    for index in range(size):
        path = inclusion_path(index, size, node)
        assert path == definition.path(index, leaves) == inclusion_path(index, size, node_reader(hashes))
        verify_inclusion(hashes[index], index, size, path, top)


@pytest.mark.parametrize("new", range(1, 65))
def test_every_consistency_proof_to_64_leaves_equals_the_definition_and_verifies(new: int, definition: ModuleType):
    leaves, hashes = tree(new)
    node, top = stored_nodes(hashes), root(hashes)
    for old in range(1, new + 1):
        path = consistency_path(old, new, node)
        assert path == definition.proof(old, leaves) == consistency_path(old, new, node_reader(hashes))
        verify_consistency(old, new, path, root(hashes[:old]), top)


def test_proofs_against_an_earlier_tree_come_from_the_nodes_of_the_later_one(definition: ModuleType):
    leaves, hashes = tree(50)
    node = stored_nodes(hashes)
    for size, index in itertools.product(range(1, 51), (0, 1, 7, 30, 49)):
        if index < size:
            assert inclusion_path(index, size, node) == definition.path(index, leaves[:size])


@given(st.integers(1, 700), st.data())
def test_proofs_in_larger_trees_verify(size: int, data: st.DataObject):
    _, hashes = tree(size)
    node, top = stored_nodes(hashes), root(hashes)
    index = data.draw(st.integers(0, size - 1))
    old = data.draw(st.integers(0, size))
    verify_inclusion(hashes[index], index, size, inclusion_path(index, size, node), top)
    verify_consistency(old, size, consistency_path(old, size, node), root(hashes[:old]), top)
    assert subtree(0, old, node) == root(hashes[:old])


def test_every_tree_extends_the_empty_one():
    _, hashes = tree(5)
    verify_consistency(0, 5, [], EMPTY_ROOT, root(hashes))
    verify_consistency(0, 0, [], EMPTY_ROOT, EMPTY_ROOT)
    with pytest.raises(ProofError, match="another one"):
        verify_consistency(0, 5, [], root(hashes), root(hashes))


@pytest.mark.parametrize("size", range(1, 18))
def test_no_changed_inclusion_proof_verifies(size: int):
    _, hashes = tree(size)
    node, top = node_reader(hashes), root(hashes)
    for index in range(size):
        leaf, path = hashes[index], inclusion_path(index, size, node)
        wrong = [
            (flipped(leaf, index), index, size, path, top),
            (leaf, index, size, path, flipped(top, index)),
            (leaf, index, size, [*path, top], top),
            (leaf, index, size, [leaf, *path], top),
            (leaf, -1, size, path, top),
            (leaf, size, size, path, top),
            (leaf, index, 0, path, top),
            (leaf, index, size * 2 + 1, path, top),
            (leaf[:-1], index, size, path, top),
        ]
        wrong += [(leaf, other, size, path, top) for other in range(size) if other != index]
        for k in range(len(path)):
            wrong.append((leaf, index, size, path[:k] + path[k + 1 :], top))
            wrong.append((leaf, index, size, [*path[:k], flipped(path[k], k), *path[k + 1 :]], top))
            wrong.append((leaf, index, size, [*path[:k], path[k][:31], *path[k + 1 :]], top))
        for call in wrong:
            with pytest.raises(ProofError):
                verify_inclusion(*call)


@pytest.mark.parametrize("new", range(1, 18))
def test_no_changed_consistency_proof_verifies(new: int):
    _, hashes = tree(new)
    node, top = node_reader(hashes), root(hashes)
    for old in range(1, new + 1):
        path, before = consistency_path(old, new, node), root(hashes[:old])
        wrong = [
            (old, new, path, flipped(before, old), top),
            (old, new, path, before, flipped(top, old)),
            (old, new, [*path, top], before, top),
            (old, new, [before, *path], before, top),
            (new + 1, new, path, before, top),
            (-1, new, path, before, top),
            (old, new, path, before[1:], top),
        ]
        wrong += [(other, new, path, before, top) for other in range(new + 1) if other != old]
        for k in range(len(path)):
            wrong.append((old, new, path[:k] + path[k + 1 :], before, top))
            wrong.append((old, new, [*path[:k], flipped(path[k], k), *path[k + 1 :]], before, top))
        for call in wrong:
            with pytest.raises(ProofError):
                verify_consistency(*call)


def test_a_failure_says_what_was_got_and_what_was_wanted():
    _, hashes = tree(6)
    path, top = inclusion_path(2, 6, node_reader(hashes)), root(hashes)
    with pytest.raises(ProofError, match="root") as caught:
        verify_inclusion(leaf_hash(b"forged"), 2, 6, path, top)
    assert caught.value.want == top.hex()
    assert caught.value.got != top.hex()
    assert len(caught.value.got) == 64
    with pytest.raises(ProofError, match="wrong length: got 2 hashes, want 3"):
        verify_inclusion(hashes[2], 2, 6, path[:2], top)


def test_a_rewritten_history_is_not_an_extension():
    _, hashes = tree(20)
    rewritten = [*hashes[:3], leaf_hash(b"another value"), *hashes[4:]]
    path = consistency_path(9, 20, node_reader(rewritten))
    with pytest.raises(ProofError, match="earlier root"):
        verify_consistency(9, 20, path, root(hashes[:9]), root(rewritten))


@pytest.mark.parametrize("call", [(0, 0), (5, 5), (-1, 5), (7, 3)])
def test_no_path_to_a_leaf_that_is_not_there(call: tuple[int, int]):
    with pytest.raises(LedgerError, match="no leaf"):
        inclusion_path(*call, node_reader(tree(5)[1]))


@pytest.mark.parametrize("call", [(6, 5), (-1, 5)])
def test_no_path_from_a_later_tree_to_an_earlier(call: tuple[int, int]):
    with pytest.raises(LedgerError, match="cannot extend"):
        consistency_path(*call, node_reader(tree(5)[1]))


def test_bytes_do_not_move_between_neighbouring_hashes():
    # A node hashes two hashes run together; a byte moved from one to the other would not be seen in the root.
    _, hashes = tree(8)
    node, top = node_reader(hashes), root(hashes)
    first, *rest = inclusion_path(2, 8, node)
    with pytest.raises(ProofError, match="a hash has the wrong length: got 33 bytes, want 32 bytes"):
        verify_inclusion(hashes[2] + first[:1], 2, 8, [first[1:], *rest], top)
    (right,) = consistency_path(4, 8, node)
    with pytest.raises(ProofError, match="a hash has the wrong length: got 33 bytes, want 32 bytes"):
        verify_consistency(4, 8, [right[1:]], root(hashes[:4]) + right[:1], top)
