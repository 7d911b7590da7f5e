"""Cliques in a graph whose vertices' neighbours are the bits of integers; the part that finding letters rests on.

`graph[v]` has bit w set where v and w are joined. `open_[v]` has bit w set where edge (v, w) is not yet covered; it is
symmetric like the graph and changed in place.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray


def neighbours(alike: NDArray[np.bool_]) -> list[int]:
    """Each vertex's neighbours as the bits of an integer."""
    rows = []
    for vertex, row in enumerate(np.packbits(alike, axis=1, bitorder="little")):
        rows.append(int.from_bytes(row.tobytes(), "little") & ~(1 << vertex))
    return rows


def bits(mask: int) -> Iterator[int]:
    """The vertices in a set, ascending."""
    while mask:
        low = mask & -mask
        yield low.bit_length() - 1
        mask ^= low


def close(clique: int, open_: list[int]) -> None:
    """Marks the edges inside a clique as covered."""
    for vertex in bits(clique):
        open_[vertex] &= ~clique


def grow(clique: int, graph: list[int]) -> int:
    """Extends a clique to a maximal one, lowest vertex first."""
    near = -1
    for vertex in bits(clique):
        near &= graph[vertex]
    while near:
        low = near & -near
        clique |= low
        near &= graph[low.bit_length() - 1]
    return clique


def edges(open_: list[int]) -> Iterator[tuple[int, int]]:
    """Open edges (u, v), u < v; edges closed while iterating are left out."""
    for u in range(len(open_)):
        later = open_[u] >> u + 1
        for step in bits(later):
            if open_[u] >> (u + 1 + step) & 1:
                yield u, u + 1 + step


def take_forced(graph: list[int], open_: list[int]) -> list[int]:
    """Takes forced cliques until none is left; closes their edges in `open_`."""
    taken = []
    changed = True
    while changed:
        changed = False
        for u, v in edges(open_):
            clique = _forced(graph, open_, u, v)
            if clique:
                taken.append(grow(clique, graph))
                close(taken[-1], open_)
                changed = True
    return taken


def _forced(graph: list[int], open_: list[int], u: int, v: int) -> int:
    """The one best clique through edge (u, v), or 0 where there are several.

    Only common neighbours with an open edge among themselves, u and v matter; if those are a clique, it covers all
    that any other clique through (u, v) could.
    """
    clique = 1 << u | 1 << v
    common = graph[u] & graph[v]
    scope = common | clique
    for vertex in bits(common):
        if open_[vertex] & scope:
            if clique & ~graph[vertex]:
                return 0
            clique |= 1 << vertex
    return clique


def matrix(rows: list[int]) -> NDArray[np.bool_]:
    """The rows of bits as a matrix, shape (k, k)."""
    found = np.zeros((len(rows), len(rows)), bool)
    for vertex, row in enumerate(rows):
        found[vertex, list(bits(row))] = True
    return found
