from types import ModuleType

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.ledger.errors import LedgerError
from sameline.ledger.merkle import EMPTY_ROOT, Frontier, leaf_hash, leaf_hashes, node_hash, root

# The eight-leaf example of the Certificate Transparency reference implementation (RFC 6962, whose tree RFC 9162
# keeps). Leaves and roots written from memory; they agree with the definition, which no wrong digit could.
LEAVES = [
    bytes.fromhex(text)
    for text in (
        "",
        "00",
        "10",
        "2021",
        "3031",
        "40414243",
        "5051525354555657",
        "606162636465666768696a6b6c6d6e6f",
    )
]
ROOTS = [
    "6e340b9cffb37a989ca544e6bb780a2c78901d3fb33738768511a30617afa01d",
    "fac54203e7cc696cf0dfcb42c92a1d9dbaf70ad9e621f4bd8d98662f00e3c125",
    "aeb6bcfe274b70a14fb067a5e5578264db0fa9b51af5e0ba159158f329e06e77",
    "d37ee418976dd95753c1c73862b9398fa2a2cf9b4ff0fdfe8b30cd95209614b7",
    "4e3bbb1f7b478dcfe71fb631631519a3bca12c9aefca1612bfce4c13a86264d4",
    "76e67dadbcdf1e10e1b74ddc608abd2f98dfb16fbce75277b5232a127f2087ef",
    "ddb89be403809e325750d3d263cd78929c2942b7942a34b77e122c9594a74c8c",
    "5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328",
]


def test_the_empty_tree_is_the_hash_of_nothing():
    # FIPS 180-4: SHA-256 of the empty string; RFC 9162 section 2.1.1.
    want = "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855"
    assert EMPTY_ROOT.hex() == root([]).hex() == Frontier().root().hex() == want


@pytest.mark.parametrize("size", range(1, 9))
def test_roots_of_the_eight_leaf_example(size: int):
    assert root([leaf_hash(leaf) for leaf in LEAVES[:size]]).hex() == ROOTS[size - 1]


@pytest.mark.parametrize("size", range(65))
def test_every_size_to_64_equals_the_definition(size: int, definition: ModuleType):
    leaves = [f"leaf {i}".encode() for i in range(size)]
    want = definition.mth(leaves)
    hashes = leaf_hashes(leaves)
    assert hashes == [leaf_hash(leaf) for leaf in leaves]
    frontier = Frontier()
    for leaf in hashes:
        frontier.add(leaf)
    assert root(hashes) == frontier.root() == want
    assert frontier.size == size


@given(st.lists(st.binary(max_size=70), min_size=65, max_size=600))
def test_larger_trees_equal_the_definition(definition: ModuleType, leaves: list[bytes]):
    hashes = [leaf_hash(leaf) for leaf in leaves]
    frontier = Frontier()
    for leaf in hashes:
        frontier.add(leaf)
    assert root(hashes) == frontier.root() == definition.mth(leaves)


def test_adding_a_leaf_completes_exactly_the_perfect_subtrees_that_end_with_it(definition: ModuleType):
    leaves = [bytes([i]) for i in range(70)]
    frontier = Frontier()
    for size in range(1, 71):
        done = frontier.add(leaf_hash(leaves[size - 1]))
        want = [level for level in range(8) if size % 2**level == 0]
        assert [level for level, _, _ in done] == want
        for level, index, value in done:
            assert value == definition.mth(leaves[index * 2**level : (index + 1) * 2**level])
            assert (index + 1) * 2**level == size


def test_a_frontier_resumes_from_its_edge():
    hashes = [leaf_hash(bytes([i])) for i in range(40)]
    for size in range(41):
        first = Frontier()
        for leaf in hashes[:size]:
            first.add(leaf)
        second = Frontier(first.size, first.edge)
        for leaf in hashes[size:]:
            second.add(leaf)
        assert second.root() == root(hashes)
        assert first.root() == root(hashes[:size])


@pytest.mark.parametrize(
    ("size", "edge"), [(1, []), (0, [b"a" * 32]), (3, [b"a" * 32]), (-1, []), (4, [b"a" * 32] * 2)]
)
def test_an_edge_that_does_not_fit_its_size_is_refused(size: int, edge: list[bytes]):
    with pytest.raises(LedgerError, match="edge"):
        Frontier(size, edge)


def test_a_forged_leaf_is_not_a_node():
    left, right = leaf_hash(b"a"), leaf_hash(b"b")
    node = node_hash(left, right)
    # In one hash domain the leaf made of two hashes would hash to their node: one leaf would pass for a tree of two.
    for forged in (left + right, b"\x01" + left + right, b"\x00" + left + right):
        assert leaf_hash(forged) != node
        assert root([leaf_hash(forged)]) != root([left, right])
    assert leaf_hash(b"") != EMPTY_ROOT


@given(st.lists(st.integers(0, 3), min_size=2, max_size=20), st.data())
def test_any_other_order_number_or_content_has_another_root(contents: list[int], data: st.DataObject):
    hashes = [leaf_hash(bytes([i])) for i in contents]
    changed = data.draw(
        st.lists(st.integers(0, 3), max_size=21).filter(lambda other: other != contents).map(list), label="changed"
    )
    assert root(hashes) != root([leaf_hash(bytes([i])) for i in changed])
