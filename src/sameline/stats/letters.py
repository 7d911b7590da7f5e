"""The fewest letters that show which groups are not shown to differ.

Groups are vertices, pairs not shown to differ are edges. A set of letters is right when two groups share one exactly
if they are joined: each letter is a clique and every edge lies in a letter. The fewest letters are a minimum clique
cover of the edges, which is hard in general (Kou, Stockmeyer & Wong 1978) and easy for what comparisons usually give.

1. Forced letters: an edge whose relevant common neighbours form a clique lies in one best letter only; it is taken.
   On stretches of ordered means, and most near misses of them, this alone finds the proven fewest.
2. A greedy cover of what remains, redundant letters swept out, gives letters that are right but perhaps not fewest.
3. A search with a fixed budget of steps then looks for fewer, or proves that there are none.

The insert-and-absorb algorithm (Piepho 2004) gives one letter for every maximal clique, up to 2^(k/2) of them where k
groups differ in k/2 separate pairs; the cover needs far fewer. Letters found are always maximal sets.

References: Piepho (2004), J. Comput. Graph. Stat. 13:456-466; Gramm, Guo, Hüffner, Niedermeier, Piepho & Schmid (2007),
Algorithms for compact letter displays, Comput. Stat. Data Anal. 52:725-736; Kou, Stockmeyer & Wong (1978), Covering
edges by cliques with regard to keyword conflicts and intersection graphs, Commun. ACM 21:135-139.
"""

from __future__ import annotations

import string
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

SEARCH_STEPS = 4000  # cliques tried when looking for fewer letters; a fixed count, so that the answer never varies
SEARCH_GROUPS = 40  # beyond it the search would not end within its budget and is not begun
_ALPHABET = string.ascii_lowercase + string.ascii_uppercase


@dataclass(frozen=True, slots=True)
class Cover:
    """Sets of vertex numbers, each ascending, in ascending order; `fewest` when proven to be as few as can be."""

    sets: list[list[int]]
    fewest: bool


def letter_name(number: int) -> str:
    """The name of the letter with this number, from 0: a-z, A-Z, then a1-Z1, a2-Z2 and so on."""
    round_, at = divmod(number, len(_ALPHABET))
    return _ALPHABET[at] + (str(round_) if round_ else "")


def cover(alike: NDArray[np.bool_], *, most: int) -> Cover | None:
    """Covers the edges of a graph by as few maximal cliques as it can.

    Args:
        alike: symmetric, shape (k, k), True for pairs not shown to differ; the diagonal is not read.
        most: give up beyond this number of sets.

    Returns:
        The cover, or None where more than `most` sets were needed.
    """
    graph = _neighbours(alike)
    open_ = list(graph)
    forced = _take_forced(graph, open_)
    if len(forced) > most:
        return None
    greedy = _greedy(graph, list(open_), most - len(forced))
    best, proven = greedy, not any(open_)
    if not proven and len(graph) <= SEARCH_GROUPS:
        best, proven = _Search(graph, greedy).run(open_)
    lonely = [1 << vertex for vertex, near in enumerate(graph) if not near]
    if best is None or len(forced) + len(best) + len(lonely) > most:
        return None
    return Cover(sorted(list(_bits(clique)) for clique in [*forced, *best, *lonely]), proven)


def _neighbours(alike: NDArray[np.bool_]) -> list[int]:
    """Each vertex's neighbours as the bits of an integer."""
    rows = []
    for vertex, row in enumerate(np.packbits(alike, axis=1, bitorder="little")):
        rows.append(int.from_bytes(row.tobytes(), "little") & ~(1 << vertex))
    return rows


def _bits(mask: int) -> Iterator[int]:
    while mask:
        low = mask & -mask
        yield low.bit_length() - 1
        mask ^= low


def _close(clique: int, open_: list[int]) -> None:
    """Marks the edges inside a clique as covered."""
    for vertex in _bits(clique):
        open_[vertex] &= ~clique


def _grow(clique: int, graph: list[int]) -> int:
    """Extends a clique to a maximal one, lowest vertex first."""
    near = -1
    for vertex in _bits(clique):
        near &= graph[vertex]
    while near:
        low = near & -near
        clique |= low
        near &= graph[low.bit_length() - 1]
    return clique


def _edges(open_: list[int]) -> Iterator[tuple[int, int]]:
    """Open edges (u, v), u < v; edges closed while iterating are left out."""
    for u in range(len(open_)):
        later = open_[u] >> u + 1
        for step in _bits(later):
            if open_[u] >> (u + 1 + step) & 1:
                yield u, u + 1 + step


def _take_forced(graph: list[int], open_: list[int]) -> list[int]:
    """Takes forced cliques until none is left; closes their edges in `open_`."""
    taken = []
    changed = True
    while changed:
        changed = False
        for u, v in _edges(open_):
            clique = _forced(graph, open_, u, v)
            if clique:
                clique = _grow(clique, graph)
                _close(clique, open_)
                taken.append(clique)
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
    for vertex in _bits(common):
        if open_[vertex] & scope:
            if clique & ~graph[vertex]:
                return 0
            clique |= 1 << vertex
    return clique


def _greedy(graph: list[int], open_: list[int], most: int) -> list[int] | None:
    """Covers the open edges, each new clique grown to close as many as it can; None beyond `most` cliques."""
    before = list(open_)
    cliques: list[int] = []
    for u, v in _edges(open_):
        if len(cliques) >= 2 * most + 8:
            return None
        clique = _grow(_grow_gainful(1 << u | 1 << v, graph, open_), graph)
        _close(clique, open_)
        cliques.append(clique)
    kept = _without_redundant(cliques, before)
    return kept if len(kept) <= most else None


def _grow_gainful(clique: int, graph: list[int], open_: list[int]) -> int:
    """Extends a clique by the vertex that closes most open edges, as long as one closes any."""
    near = -1
    for vertex in _bits(clique):
        near &= graph[vertex]
    while near:
        gain, best = 0, -1
        for vertex in _bits(near):
            closes = (open_[vertex] & clique).bit_count()
            if closes > gain:
                gain, best = closes, vertex
        if best < 0:
            break
        clique |= 1 << best
        near &= graph[best]
    return clique


def _without_redundant(cliques: list[int], open_: list[int]) -> list[int]:
    """Drops cliques whose edges all lie in others, earliest first: later ones were grown for what was left."""
    wanted = np.zeros((len(open_), len(open_)), bool)
    for vertex, near in enumerate(open_):
        wanted[vertex, list(_bits(near))] = True
    times = np.zeros(wanted.shape, np.int64)
    inside = [np.ix_(members, members) for members in (list(_bits(clique)) for clique in cliques)]
    for block in inside:
        times[block] += 1
    kept = []
    for clique, block in zip(cliques, inside, strict=True):
        if np.all(times[block][wanted[block]] > 1):
            times[block] -= 1
        else:
            kept.append(clique)
    return kept


class _Search:
    """Branch and bound over the cliques through the open edge with the fewest of them."""

    def __init__(self, graph: list[int], best: list[int] | None) -> None:
        self.graph = graph
        self.best = best
        self.steps = 0

    def run(self, open_: list[int]) -> tuple[list[int] | None, bool]:
        """The best cover found, and whether none smaller exists."""
        self._descend(list(open_), [])
        return self.best, self.steps <= SEARCH_STEPS and self.best is not None

    def _descend(self, open_: list[int], taken: list[int]) -> None:
        taken = taken + _take_forced(self.graph, open_)
        if not any(open_):
            if self.best is None or len(taken) < len(self.best):
                self.best = taken
            return
        if self.best is not None and len(taken) + self._at_least(open_) >= len(self.best):
            return
        for clique in self._branches(open_):
            self.steps += 1
            if self.steps > SEARCH_STEPS:
                return
            rest = list(open_)
            _close(clique, rest)
            self._descend(rest, [*taken, clique])

    def _at_least(self, open_: list[int]) -> int:
        """A lower bound: open edges no two of which lie in one clique, picked scarcest neighbourhood first."""
        edges = sorted(_edges(open_), key=lambda edge: (self.graph[edge[0]] & self.graph[edge[1]]).bit_count())
        apart: list[tuple[int, int]] = []
        for u, v in edges:
            near = (self.graph[u] | 1 << u) & (self.graph[v] | 1 << v)
            ends = 1 << u | 1 << v
            if all(pair & ~near for pair, _ in apart):
                apart.append((ends, near))
        return len(apart)

    def _branches(self, open_: list[int]) -> list[int]:
        """The maximal cliques through the open edge with the fewest common neighbours, most gainful first."""
        u, v = min(_edges(open_), key=lambda edge: (self.graph[edge[0]] & self.graph[edge[1]]).bit_count())
        found: list[int] = []
        self._maximal(1 << u | 1 << v, self.graph[u] & self.graph[v], 0, found)
        return sorted(found, key=lambda clique: (-_gain(clique, open_), clique))

    def _maximal(self, clique: int, candidates: int, done: int, found: list[int]) -> None:
        """Bron and Kerbosch (1973) with a pivot, up to the budget of steps."""
        if not candidates and not done:
            found.append(clique)
            return
        if self.steps + len(found) > SEARCH_STEPS:
            self.steps = SEARCH_STEPS + 1
            return
        pivot = max(_bits(candidates | done), key=lambda vertex: (self.graph[vertex] & candidates).bit_count())
        for vertex in _bits(candidates & ~self.graph[pivot]):
            near = self.graph[vertex]
            self._maximal(clique | 1 << vertex, candidates & near, done & near, found)
            candidates &= ~(1 << vertex)
            done |= 1 << vertex


def _gain(clique: int, open_: list[int]) -> int:
    return sum((open_[vertex] & clique).bit_count() for vertex in _bits(clique))
